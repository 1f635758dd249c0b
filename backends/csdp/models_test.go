package csdp

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"towpath/model"
)

// The models of these tests are written by hand in the terms of the two sheets.

type term struct {
	col uint32
	v   float64
}

func psd(n int) model.Block {
	return model.Block{Field: model.Symmetric, Rows: n, Cols: n, Cone: model.PSD}
}
func nonneg(n int) model.Block { return model.Block{Rows: n, Cols: 1, Cone: model.Nonneg} }
func free(n int) model.Block   { return model.Block{Rows: n, Cols: 1, Cone: model.Free} }

// in puts rows with their constants into a cone; consts may be nil.
func in(f model.Field, k model.ConeKind, consts []float64, rows ...[]term) model.Constraint {
	c := model.Constraint{Map: model.Map{Field: f, Lin: model.Matrix{Start: []int{0}}}, Cone: model.Cone{Kind: k}}
	lin := &c.Map.Lin
	for _, r := range rows {
		for _, t := range r {
			lin.Col, lin.Re = append(lin.Col, t.col), append(lin.Re, t.v)
		}
		lin.Start = append(lin.Start, len(lin.Col))
	}
	for _, v := range consts {
		c.Map.Const = append(c.Map.Const, complex(v, 0))
	}
	return c
}

func cost(constant float64, terms ...term) model.Objective {
	o := model.Objective{Const: constant}
	for _, t := range terms {
		o.Col, o.Coef = append(o.Col, t.col), append(o.Coef, complex(t.v, 0))
	}
	return o
}

// valid is the model, which the broker would have let through.
func valid(t testing.TB, m *model.Model) *model.Model {
	t.Helper()
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	return m
}

// sized is a number of any size that a driver is given, one in four an exact zero.
func sized(rng *rand.Rand) float64 {
	switch rng.IntN(8) {
	case 0, 1:
		return 0
	case 2:
		return rng.NormFloat64() * 1e60
	case 3:
		return rng.NormFloat64() * 1e-60
	}
	return rng.NormFloat64()
}

// someTerms is a sparse row on n columns, at times without any.
func someTerms(rng *rand.Rand, n int) []term {
	var out []term
	for c := range n {
		if rng.IntN(3) == 0 {
			out = append(out, term{uint32(c), sized(rng)})
		}
	}
	return out
}

func someRows(rng *rand.Rand, n, count int) (rows [][]term, consts []float64) {
	for range count {
		rows, consts = append(rows, someTerms(rng, n)), append(consts, sized(rng))
	}
	return rows, consts
}

// randomEquality is a model for the equality sheet: matrices, vectors and rectangles in cones under real equalities.
func randomEquality(rng *rand.Rand) *model.Model {
	m := &model.Model{}
	for range 1 + rng.IntN(3) {
		n := 1 + rng.IntN(4)
		b := psd(n)
		if rng.IntN(3) == 0 {
			b = model.Block{Rows: n, Cols: 1 + rng.IntN(2), Cone: model.Nonneg}
		}
		m.Blocks = append(m.Blocks, b)
	}
	n := m.Starts()[len(m.Blocks)]
	m.Objective = cost(rng.NormFloat64(), someTerms(rng, n)...)
	for range 1 + rng.IntN(3) {
		rows, consts := someRows(rng, n, 1+rng.IntN(3))
		if rng.IntN(4) == 0 {
			consts = nil
		}
		m.Constraints = append(m.Constraints, in(model.Real, model.Zero, consts, rows...))
	}
	return m
}

// randomInequality is a model for the inequality sheet: free columns, matrices and rows in cones.
func randomInequality(rng *rand.Rand) *model.Model {
	m := &model.Model{}
	for range 1 + rng.IntN(2) {
		m.Blocks = append(m.Blocks, free(1+rng.IntN(4)))
	}
	n := m.Starts()[len(m.Blocks)]
	m.Objective = cost(rng.NormFloat64(), someTerms(rng, n)...)
	for range 1 + rng.IntN(3) {
		f, k, count := model.Symmetric, model.PSD, model.PackedLen(1+rng.IntN(4))
		if rng.IntN(3) == 0 {
			f, k = model.Real, model.Nonneg
		}
		rows, consts := someRows(rng, n, count)
		m.Constraints = append(m.Constraints, in(f, k, consts, rows...))
	}
	return m
}

func seedName(seed uint64) string { return fmt.Sprintf("seed %d", seed) }
