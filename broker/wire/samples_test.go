package wire

import (
	"math"
	"math/rand/v2"
	"testing"

	"towpath/model"
)

// sample makes a valid model with every field, cone and form, of a size that grows with n.
func sample(r *rand.Rand, n int) *model.Model {
	m := &model.Model{Name: "sample", Blocks: []model.Block{
		{Name: "x", Field: model.Real, Rows: n, Cols: 1, Cone: model.Nonneg},
		{Name: "z", Field: model.Complex, Rows: n, Cols: 2},
		{Field: model.Symmetric, Rows: 3, Cols: 3, Cone: model.PSD},
		{Name: "H", Field: model.Hermitian, Rows: 4, Cols: 4},
	}}
	m.Blocks[0].Bounds = bounds(&m.Blocks[0], r)
	m.Blocks[1].Bounds = bounds(&m.Blocks[1], r)
	m.Blocks[3].Bounds = bounds(&m.Blocks[3], r)
	entries := m.Starts()[len(m.Blocks)]
	m.Objective = model.Objective{Sense: model.Maximize, Const: 2.5}
	realEntry := reality(m)
	for c := range entries {
		if r.IntN(3) > 0 {
			m.Objective.Col = append(m.Objective.Col, uint32(c))
			m.Objective.Coef = append(m.Objective.Coef, number1(r, realEntry[c]))
		}
	}
	add := func(f model.Field, kind model.ConeKind, rows int) *model.Constraint {
		if f.IsMatrix() {
			rows = model.PackedLen(rows)
		}
		m.Constraints = append(m.Constraints, model.Constraint{Name: f.String() + " in " + kind.String(), Cone: model.Cone{Kind: kind}, Map: model.Map{Field: f}})
		c := &m.Constraints[len(m.Constraints)-1]
		c.Map.Lin.Start = make([]int, rows+1) // rows exist, so that RealRow can tell them apart
		c.Map.Lin = matrix(r, rows, entries, func(row, col int) (ok, isReal bool) { return true, c.RealRow(row) && realEntry[col] || f == model.Real })
		if f.IsComplex() {
			conj := matrix(r, rows, entries, func(row, col int) (ok, isReal bool) { return !realEntry[col], false })
			c.Map.Conj = &conj
		}
		for row := range rows {
			c.Map.Const = append(c.Map.Const, number1(r, c.RealRow(row)))
		}
		return c
	}
	add(model.Real, model.Zero, n)
	add(model.Complex, model.Zero, n)
	add(model.Real, model.Lorentz, n+1)
	add(model.Complex, model.RotatedLorentz, n+2)
	add(model.Symmetric, model.PSD, 3)
	add(model.Hermitian, model.PSD, 3)
	add(model.Hermitian, model.Zero, 2)
	c := add(model.Complex, model.Range, n)
	for range n {
		c.Cone.Lower = append(c.Cone.Lower, complex(-r.Float64(), math.Inf(-1)))
		c.Cone.Upper = append(c.Cone.Upper, complex(r.Float64(), 1))
	}
	return m
}

func reality(m *model.Model) (out []bool) {
	for k := range m.Blocks {
		for e := range m.Blocks[k].Entries() {
			out = append(out, m.Blocks[k].RealEntry(e))
		}
	}
	return out
}

func number1(r *rand.Rand, isReal bool) complex128 {
	if isReal {
		return complex(r.NormFloat64(), 0)
	}
	return complex(r.NormFloat64(), r.NormFloat64())
}

func bounds(b *model.Block, r *rand.Rand) *model.Bounds {
	out := &model.Bounds{}
	for k := range b.Entries() {
		lower, upper := complex(-r.Float64(), 0), complex(math.Inf(1), 0)
		if !b.RealEntry(k) {
			lower, upper = complex(-1, math.Inf(-1)), complex(r.Float64(), 3)
		}
		out.Lower, out.Upper = append(out.Lower, lower), append(out.Upper, upper)
	}
	return out
}

func matrix(r *rand.Rand, rows, cols int, put func(row, col int) (ok, isReal bool)) model.Matrix {
	m := model.Matrix{Start: []int{0}}
	allReal := true
	for row := range rows {
		for col := range cols {
			if ok, isReal := put(row, col); ok && r.IntN(2) == 0 {
				allReal = allReal && isReal
				m.Col, m.Z = append(m.Col, uint32(col)), append(m.Z, number1(r, isReal))
			}
		}
		m.Start = append(m.Start, len(m.Col))
	}
	if allReal {
		for _, v := range m.Z {
			m.Re = append(m.Re, real(v))
		}
		m.Z = nil
	}
	return m
}

// sameModel compares two models number by number; which of Re and Z holds real numbers does not matter.
func sameModel(t *testing.T, got, want *model.Model) {
	t.Helper()
	if got.Name != want.Name || len(got.Blocks) != len(want.Blocks) || len(got.Constraints) != len(want.Constraints) {
		t.Fatalf("got '%s' with %d blocks and %d constraints, want '%s' with %d and %d", got.Name, len(got.Blocks), len(got.Constraints), want.Name, len(want.Blocks), len(want.Constraints))
	}
	for k := range want.Blocks {
		g, w := got.Blocks[k], want.Blocks[k]
		if (g.Bounds == nil) != (w.Bounds == nil) {
			t.Fatalf("block %d: bounds %v, want %v", k, g.Bounds, w.Bounds)
		}
		if w.Bounds != nil {
			sameNumbers(t, "lower", g.Bounds.Lower, w.Bounds.Lower)
			sameNumbers(t, "upper", g.Bounds.Upper, w.Bounds.Upper)
		}
		g.Bounds, w.Bounds = nil, nil
		if g != w {
			t.Errorf("block %d: got %+v, want %+v", k, g, w)
		}
	}
	if got.Objective.Sense != want.Objective.Sense || got.Objective.Const != want.Objective.Const {
		t.Errorf("objective %v %g", got.Objective.Sense, got.Objective.Const)
	}
	sameMatrix(t, "objective", &model.Matrix{Start: []int{0, len(got.Objective.Col)}, Col: got.Objective.Col, Z: got.Objective.Coef},
		&model.Matrix{Start: []int{0, len(want.Objective.Col)}, Col: want.Objective.Col, Z: want.Objective.Coef})
	for k := range want.Constraints {
		g, w := &got.Constraints[k], &want.Constraints[k]
		if g.Name != w.Name || g.Map.Field != w.Map.Field || g.Cone.Kind != w.Cone.Kind {
			t.Errorf("constraint %d: got %s %v %v, want %s %v %v", k, g.Name, g.Map.Field, g.Cone.Kind, w.Name, w.Map.Field, w.Cone.Kind)
		}
		sameMatrix(t, w.Name, &g.Map.Lin, &w.Map.Lin)
		if w.Map.Conj != nil && w.Map.Conj.Nonzeros() > 0 {
			sameMatrix(t, w.Name+", conjugates", g.Map.Conj, w.Map.Conj)
		}
		sameNumbers(t, w.Name+", constant", g.Map.Const, w.Map.Const)
		sameNumbers(t, w.Name+", lower", g.Cone.Lower, w.Cone.Lower)
		sameNumbers(t, w.Name+", upper", g.Cone.Upper, w.Cone.Upper)
	}
}

func sameMatrix(t *testing.T, what string, got, want *model.Matrix) {
	t.Helper()
	if got == nil || got.Rows() != want.Rows() || got.Nonzeros() != want.Nonzeros() {
		t.Fatalf("%s: got %v, want %v", what, got, want)
	}
	for r := range want.Start {
		if got.Start[r] != want.Start[r] {
			t.Fatalf("%s: row starts %v, want %v", what, got.Start, want.Start)
		}
	}
	for p := range want.Col {
		if got.Col[p] != want.Col[p] || got.At(p) != want.At(p) {
			t.Fatalf("%s, position %d: %v at %d, want %v at %d", what, p, got.At(p), got.Col[p], want.At(p), want.Col[p])
		}
	}
}

func sameNumbers(t *testing.T, what string, got, want []complex128) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%s: %d numbers, want %d", what, len(got), len(want))
	}
	for i := range want {
		if got[i] != want[i] {
			t.Fatalf("%s, number %d: %v, want %v", what, i, got[i], want[i])
		}
	}
}
