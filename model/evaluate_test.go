package model_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"towpath/model"
	"towpath/model/modeltest"
)

// Two entries: z complex, and H Hermitian of order 2, packed as (0,0), (1,0), (1,1).
func small() *model.Model {
	return &model.Model{
		Blocks: []model.Block{
			{Field: model.Complex, Rows: 1, Cols: 1},
			{Field: model.Hermitian, Rows: 2, Cols: 2, Cone: model.PSD},
		},
		Objective: model.Objective{Sense: model.Maximize, Col: []uint32{0, 2}, Coef: []complex128{2 - 1i, 1i}, Const: 5},
		Constraints: []model.Constraint{
			{ // (1+i) z + i conj(z) + (2-i) h10 + 3i, complex
				Map: model.Map{Field: model.Complex,
					Lin:   model.Matrix{Start: []int{0, 2}, Col: []uint32{0, 2}, Z: []complex128{1 + 1i, 2 - 1i}},
					Conj:  &model.Matrix{Start: []int{0, 1}, Col: []uint32{0}, Z: []complex128{1i}},
					Const: []complex128{3i}},
				Cone: model.Cone{Kind: model.Zero},
			},
			{ // Re((1+2i) z) - 3 h00 + 1, real
				Map: model.Map{Field: model.Real,
					Lin:   model.Matrix{Start: []int{0, 2}, Col: []uint32{0, 1}, Z: []complex128{1 + 2i, -3}},
					Const: []complex128{1}},
				Cone: model.Cone{Kind: model.Nonneg},
			},
		},
	}
}

// By hand, at z = 3 + 4i and h00 = 2, h10 = 1 - i, h11 = 7.
func TestRowsAndObjectiveByHand(t *testing.T) {
	m := small()
	x := &model.Point{Values: [][]complex128{{3 + 4i}, {2, 1 - 1i, 7}}}
	// (1+i)(3+4i) = -1+7i; i(3-4i) = 4+3i; (2-i)(1-i) = 1-3i; together with 3i: 4+10i.
	if got := m.RowsAt(0, x); !slices.Equal(got, []complex128{4 + 10i}) {
		t.Errorf("complex row %v, want 4+10i", got)
	}
	// Re((1+2i)(3+4i)) = -5; -6; +1.
	if got := m.RowsAt(1, x); !slices.Equal(got, []complex128{-10}) {
		t.Errorf("real row %v, want -10", got)
	}
	// Re((2-i)(3+4i)) = 10; Re(i(1-i)) = 1; +5.
	if got := m.ObjectiveAt(x); got != 16 {
		t.Errorf("objective %g, want 16", got)
	}
}

// By hand: off the diagonal an entry counts twice in the inner product, so its derivative is halved.
func TestAdjointAndGradientByHand(t *testing.T) {
	m := small()
	same := func(what string, got *model.Point, want [][]complex128) {
		t.Helper()
		for b := range want {
			if !slices.Equal(got.Values[b], want[b]) {
				t.Errorf("%s, block %d: %v, want %v", what, b, got.Values[b], want[b])
			}
		}
	}
	// y = 1+2i: conj(1+i)(1+2i) + i conj(1+2i) = (3+i) + (2+i); h10: conj(2-i)(1+2i)/2 = 5i/2.
	same("complex row", m.AdjointAt(0, []complex128{1 + 2i}), [][]complex128{{5 + 2i}, {0, 2.5i, 0}})
	// y = 2: conj(1+2i) 2; h00: -6.
	same("real row", m.AdjointAt(1, []complex128{2}), [][]complex128{{2 - 4i}, {-6, 0, 0}})
	same("objective", m.Gradient(), [][]complex128{{2 + 1i}, {0, -0.5i, 0}})
}

// The law of the adjoint, and with it the package comment's inner products, on models of every kind.
func TestAdjointLaw(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 8))
	for seed := range uint64(100) {
		m, _ := modeltest.Recipe{Seed: seed, Outcome: model.Optimal}.Make()
		x, origin := randomPoint(rng, m), &model.Point{}
		for b := range m.Blocks {
			origin.Values = append(origin.Values, make([]complex128, m.Blocks[b].Entries()))
		}
		for k := range m.Constraints {
			c := &m.Constraints[k]
			fx, f0 := m.RowsAt(k, x), m.RowsAt(k, origin)
			y := make([]complex128, len(fx))
			left := 0.0
			for r := range y {
				y[r] = complex(rng.NormFloat64(), 0)
				if !c.RealRow(r) {
					y[r] += complex(0, rng.NormFloat64())
				}
				left += c.Weight(r) * dot(y[r], fx[r]-f0[r])
			}
			if right := product(m, m.AdjointAt(k, y), x); math.Abs(left-right) > 1e-12*(1+math.Abs(left)) {
				t.Errorf("seed %d, constraint %d (%s %s): <y, F x> = %.15g, <F* y, x> = %.15g", seed, k, c.Map.Field, c.Cone.Kind, left, right)
			}
		}
		rise := m.ObjectiveAt(x) - m.ObjectiveAt(origin)
		if slope := product(m, m.Gradient(), x); math.Abs(rise-slope) > 1e-12*(1+math.Abs(rise)) {
			t.Errorf("seed %d: f(x) - f(0) = %.15g, <c, x> = %.15g", seed, rise, slope)
		}
	}
}

// The Lagrangian of the package comment has the known multipliers' signs: with them it does not depend on x, up to the
// multipliers of the blocks' own cones, which stationarity gives.
func TestLagrangianSigns(t *testing.T) {
	rng := rand.New(rand.NewPCG(13, 21))
	for seed := range uint64(60) {
		m, a := modeltest.Recipe{Seed: seed, Outcome: model.Optimal}.Make()
		sign := 1.0
		if m.Objective.Sense == model.Maximize {
			sign = -1
		}
		own := m.Gradient() // becomes s = c - F* y - z
		for b := range own.Values {
			for k := range own.Values[b] {
				own.Values[b][k] *= complex(sign, 0)
				if m.Blocks[b].Bounds != nil {
					own.Values[b][k] -= a.Multipliers.Bounds[b][k]
				}
			}
		}
		for k := range m.Constraints {
			for b, v := range m.AdjointAt(k, a.Multipliers.Constraints[k]).Values {
				for i := range v {
					own.Values[b][i] -= v[i]
				}
			}
		}
		lagrangian := func(x *model.Point) float64 {
			l := sign*m.ObjectiveAt(x) - product(m, own, x)
			for k := range m.Constraints {
				for r, f := range m.RowsAt(k, x) {
					l -= m.Constraints[k].Weight(r) * dot(a.Multipliers.Constraints[k][r], f)
				}
			}
			for b := range m.Blocks {
				for k, z := range a.Multipliers.Bounds[b] {
					l -= m.Blocks[b].Weight(k) * dot(z, x.Values[b][k])
				}
			}
			return l
		}
		here, there := lagrangian(a.Point), lagrangian(randomPoint(rng, m))
		if math.Abs(here-there) > 1e-10*(1+math.Abs(here)) {
			t.Errorf("seed %d: the Lagrangian is %.12g at the optimum and %.12g elsewhere", seed, here, there)
		}
		if slack := product(m, own, a.Point); math.Abs(slack) > 1e-10 {
			t.Errorf("seed %d: <s, x> = %g at the optimum", seed, slack)
		}
	}
}

func randomPoint(rng *rand.Rand, m *model.Model) *model.Point {
	p := &model.Point{}
	for b := range m.Blocks {
		v := make([]complex128, m.Blocks[b].Entries())
		for k := range v {
			v[k] = complex(rng.NormFloat64(), 0)
			if !m.Blocks[b].RealEntry(k) {
				v[k] += complex(0, rng.NormFloat64())
			}
		}
		p.Values = append(p.Values, v)
	}
	return p
}

func dot(a, b complex128) float64 { return real(a)*real(b) + imag(a)*imag(b) }

// product is <a, b> over all blocks.
func product(m *model.Model, a, b *model.Point) float64 {
	s := 0.0
	for i := range m.Blocks {
		for k := range a.Values[i] {
			s += m.Blocks[i].Weight(k) * dot(a.Values[i][k], b.Values[i][k])
		}
	}
	return s
}
