package check

import (
	"math"

	"towpath/model"
)

// sum adds with compensation (A. Neumaier 1974, from memory): an examiner must not lose what a solver kept.
type sum struct{ s, c float64 }

func (a *sum) add(x float64) {
	t := a.s + x
	if math.Abs(a.s) >= math.Abs(x) {
		a.c += (a.s - t) + x
	} else {
		a.c += (x - t) + a.s
	}
	a.s = t
}

func (a *sum) value() float64 { return a.s + a.c }

// tally is a complex sum that also measures its terms.
type tally struct {
	re, im sum
	terms  float64 // root of the sum of squares
}

func (t *tally) add(z complex128) {
	t.re.add(real(z))
	t.im.add(imag(z))
	t.terms = math.Hypot(t.terms, size(z))
}

// weigh counts a term of the given size.
func (t *tally) weigh(size float64) { t.terms = math.Hypot(t.terms, size) }

// rows evaluates a constraint at the entries x, or only its linear part, and returns the size of every row's terms.
func rows(c *model.Constraint, x []complex128, linear bool) (out []complex128, terms []float64) {
	f := &c.Map
	out, terms = make([]complex128, f.Rows()), make([]float64, f.Rows())
	for r := range out {
		var t tally
		for p := f.Lin.Start[r]; p < f.Lin.Start[r+1]; p++ {
			t.add(f.Lin.At(p) * x[f.Lin.Col[p]])
		}
		if f.Conj != nil {
			for p := f.Conj.Start[r]; p < f.Conj.Start[r+1]; p++ {
				t.add(f.Conj.At(p) * conj(x[f.Conj.Col[p]]))
			}
		}
		if !linear {
			t.add(f.ConstAt(r))
		}
		out[r] = complex(t.re.value(), 0)
		if !c.RealRow(r) {
			out[r] += complex(0, t.im.value())
		}
		terms[r] = t.terms
	}
	return out, terms
}

// entries lists the entries of a point in one slice.
func entries(p *model.Point) []complex128 {
	var x []complex128
	for _, v := range p.Values {
		x = append(x, v...)
	}
	return x
}

// objective evaluates Re(c^T x) + constant.
func objective(m *model.Model, x []complex128) float64 {
	var s sum
	s.add(m.Objective.Const)
	for k, col := range m.Objective.Col {
		s.add(real(m.Objective.Coef[k]) * real(x[col]))
		s.add(-imag(m.Objective.Coef[k]) * imag(x[col]))
	}
	return s.value()
}

// reduced returns, for every block and in its inner product, c - F^* y - z (c only with cost), and the size of every
// entry's terms. With <a,b> = Re(conj(a) b):
//
//	<y, l x> = <conj(l) y, x>,  <y, l conj(x)> = <l conj(y), x>,  Re(c x) = <conj(c), x>
func reduced(m *model.Model, y *model.Multipliers, cost bool) (out [][]complex128, terms [][]float64) {
	starts := m.Starts()
	t := make([]tally, starts[len(m.Blocks)])
	if cost {
		sign := complex(1, 0)
		if m.Objective.Sense == model.Maximize {
			sign = -1
		}
		for k, col := range m.Objective.Col {
			t[col].add(sign * conj(m.Objective.Coef[k]))
		}
	}
	for k := range m.Constraints {
		c := &m.Constraints[k]
		f := &c.Map
		// In cones whose rows do not stand for themselves the multiplier as a whole is the measure: where it should be
		// zero it is so only up to its rounding.
		whole := 0.0
		if !cost && !splits(c.Cone.Kind) {
			whole = norm(y.Constraints[k], c.Weight)
		}
		for r := range f.Rows() {
			v := -y.Constraints[k][r] * complex(c.Weight(r), 0)
			if v == 0 && whole == 0 {
				continue
			}
			for p := f.Lin.Start[r]; p < f.Lin.Start[r+1]; p++ {
				t[f.Lin.Col[p]].add(conj(f.Lin.At(p)) * v)
				t[f.Lin.Col[p]].weigh(size(f.Lin.At(p)) * whole)
			}
			if f.Conj != nil {
				for p := f.Conj.Start[r]; p < f.Conj.Start[r+1]; p++ {
					t[f.Conj.Col[p]].add(f.Conj.At(p) * conj(v))
					t[f.Conj.Col[p]].weigh(size(f.Conj.At(p)) * whole)
				}
			}
		}
	}
	for b := range m.Blocks {
		blk := &m.Blocks[b]
		v, sizes := make([]complex128, blk.Entries()), make([]float64, blk.Entries())
		for k := range v {
			at := &t[starts[b]+k]
			w := blk.Weight(k)
			if blk.Bounds != nil {
				at.add(-y.Bounds[b][k] * complex(w, 0))
			}
			v[k] = complex(at.re.value()/w, 0)
			if !blk.RealEntry(k) {
				v[k] += complex(0, at.im.value()/w)
			}
			sizes[k] = at.terms
		}
		out, terms = append(out, v), append(terms, sizes)
	}
	return out, terms
}

// dualObjective is -sum <y, F(0)> + sum over range rows and bounds of (lower y^+ - upper y^-), without the objective's
// constant.
func dualObjective(m *model.Model, y *model.Multipliers) float64 {
	var s sum
	pushes := func(w float64, v, lower, upper complex128) {
		if limit, ok := side(real(v), real(lower), real(upper)); ok {
			s.add(w * real(v) * limit)
		}
		if limit, ok := side(imag(v), imag(lower), imag(upper)); ok {
			s.add(w * imag(v) * limit)
		}
	}
	for k := range m.Constraints {
		c := &m.Constraints[k]
		for r, v := range y.Constraints[k] {
			w, x := c.Weight(r), c.Map.ConstAt(r)
			s.add(-w * real(v) * real(x))
			if !c.RealRow(r) {
				s.add(-w * imag(v) * imag(x))
			}
			if c.Cone.Kind == model.Range {
				pushes(w, v, c.Cone.Lower[r], c.Cone.Upper[r])
			}
		}
	}
	for b := range m.Blocks {
		if blk := &m.Blocks[b]; blk.Bounds != nil {
			for k, v := range y.Bounds[b] {
				pushes(blk.Weight(k), v, blk.Bounds.Lower[k], blk.Bounds.Upper[k])
			}
		}
	}
	return s.value()
}
