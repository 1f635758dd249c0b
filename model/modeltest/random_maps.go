package modeltest

import (
	"math"

	"towpath/model"
)

// linear draws a sparse map without constants, with conjugate terms on some complex rows, and scales it.
func (g *garden) linear(s shape, rows int) model.Map {
	m := &model.Model{Blocks: g.bs}
	starts := m.Starts()
	probe := blank(s, rows)
	f := model.Map{Field: s.field}
	isComplex := s.field.IsComplex()
	scale := complex(math.Pow(10, g.Spread*(2*g.rng.Float64()-1)), 0)
	draw := func(conjugates bool) model.Matrix {
		a := model.Matrix{Start: make([]int, rows+1)}
		for r := range rows {
			for b := range m.Blocks {
				for k := range m.Blocks[b].Entries() {
					realEntry := m.Blocks[b].RealEntry(k)
					if g.rng.Float64() < 0.4 || conjugates && realEntry {
						continue
					}
					// A real row means the real part of what its coefficients say, so a complex entry may have a
					// complex coefficient there; a real entry may not.
					v := scale * g.number(!realEntry || isComplex && !probe.RealRow(r))
					a.Col, a.Z = append(a.Col, uint32(starts[b]+k)), append(a.Z, v)
				}
			}
			a.Start[r+1] = len(a.Col)
		}
		return a
	}
	f.Lin = draw(false)
	if isComplex && g.rng.IntN(2) == 0 {
		c := draw(true)
		f.Conj = &c
	}
	return f
}

// bounds gives some blocks limits that hold their entries, and returns the multipliers. Blocks with a cone of their own
// keep it.
func (g *garden) bounds(m *model.Model) [][]complex128 {
	z := make([][]complex128, len(m.Blocks))
	for b := range m.Blocks {
		blk := &m.Blocks[b]
		if g.rng.IntN(3) > 0 {
			continue
		}
		n := blk.Entries()
		box := &model.Bounds{Lower: make([]complex128, n), Upper: make([]complex128, n)}
		z[b] = make([]complex128, n)
		for k := range n {
			x := g.x[b][k]
			lo, up, mult := g.interval(real(x))
			var ilo, iup, imult float64
			if !blk.RealEntry(k) {
				ilo, iup, imult = g.interval(imag(x))
			}
			box.Lower[k], box.Upper[k], z[b][k] = complex(lo, ilo), complex(up, iup), complex(mult, imult)
		}
		blk.Bounds = box
	}
	return z
}

// recedingBounds gives some blocks limits that hold their entries and all of a ray from there.
func (g *garden) recedingBounds(m *model.Model, ray *model.Point) {
	sides := func(x, d float64) (lower, upper float64) {
		lower, upper, _ = g.interval(x)
		switch {
		case d > 0:
			upper = math.Inf(1)
		case d < 0:
			lower = math.Inf(-1)
		}
		return lower, upper
	}
	for b := range m.Blocks {
		blk := &m.Blocks[b]
		if g.rng.IntN(3) > 0 {
			continue
		}
		n := blk.Entries()
		box := &model.Bounds{Lower: make([]complex128, n), Upper: make([]complex128, n)}
		for k := range n {
			x, d := g.x[b][k], ray.Values[b][k]
			lo, up := sides(real(x), real(d))
			var ilo, iup float64
			if !blk.RealEntry(k) {
				ilo, iup = sides(imag(x), imag(d))
			}
			box.Lower[k], box.Upper[k] = complex(lo, ilo), complex(up, iup)
		}
		blk.Bounds = box
	}
}

// addFirstColumn adds a first column of the given numbers to a matrix.
func addFirstColumn(a *model.Matrix, column []complex128) model.Matrix {
	out := model.Matrix{Start: make([]int, len(a.Start))}
	for r := range column {
		p, end := a.Start[r], a.Start[r+1]
		if p < end && a.Col[p] == 0 {
			column[r] += a.At(p)
			p++
		}
		out.Col, out.Z = append(out.Col, 0), append(out.Z, column[r])
		for ; p < end; p++ {
			out.Col, out.Z = append(out.Col, a.Col[p]), append(out.Z, a.At(p))
		}
		out.Start[r+1] = len(out.Col)
	}
	return out
}
