package interior

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"towpath/backends"
	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

// cones of every kind and of some sizes.
func cones() map[string]func() cone {
	out := map[string]func() cone{}
	for _, n := range []int{1, 2, 5, 9} {
		out[fmt.Sprintf("orthant %d", n)] = func() cone { return &orthant{n: n} }
		out[fmt.Sprintf("lorentz %d", n)] = func() cone { return newLorentz(n) }
		out[fmt.Sprintf("symmetric %d", n)] = func() cone { return newPSD(n, false) }
		out[fmt.Sprintf("hermitian %d", n)] = func() cone { return newPSD(n, true) }
	}
	return out
}

// inside draws a point inside: the unit plus a step that stays inside. It uses up the scaling of c.
func inside(c cone, rng *rand.Rand) []float64 {
	p, e := make([]float64, c.dim()), make([]float64, c.dim())
	c.unit(e)
	d := make([]float64, c.dim())
	for k := range d {
		d[k] = rng.NormFloat64()
	}
	probe := make([]float64, c.dim())
	copy(probe, e)
	if !c.scale(probe, e) {
		panic("the unit is not inside")
	}
	a := 0.9 * min(3, c.step(probe, d, e, make([]float64, c.dim()), 3))
	for k := range p {
		p[k] = e[k] + a*d[k]
	}
	return p
}

func apart(a, b []float64) float64 {
	worst := 0.0
	for k := range a {
		worst = max(worst, math.Abs(a[k]-b[k])/(1+math.Abs(a[k])))
	}
	return worst
}

// The scaling of Nesterov and Todd: H q = p, and H^-1 undoes H.
func TestScaling(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 1))
	for name, make1 := range cones() {
		c := make1()
		for range 20 {
			p, q := inside(make1(), rng), inside(make1(), rng)
			if !c.scale(p, q) {
				t.Fatalf("%s: inner points are refused", name)
			}
			h, back := make([]float64, c.dim()), make([]float64, c.dim())
			c.apply(h, q, false)
			if e := apart(p, h); e > 1e-9 {
				t.Errorf("%s: H q is off p by %g", name, e)
			}
			c.apply(back, h, true)
			if e := apart(q, back); e > 1e-9 {
				t.Errorf("%s: H^-1 H q is off q by %g", name, e)
			}
			// H is symmetric.
			x, hx := inside(make1(), rng), make([]float64, c.dim())
			c.apply(hx, x, false)
			if a, b := dot(hx, q), dot(x, p); math.Abs(a-b) > 1e-9*(1+math.Abs(a)) {
				t.Errorf("%s: <H x, q> = %g, <x, H q> = %g", name, a, b)
			}
		}
	}
}

// Without a direction the corrector aims at the point of the central path that belongs to q: p + corrector = mu q^-1, whose
// product with q is mu times the degree; and at nothing when mu is 0.
func TestCorrectorAimsAtTheCentralPath(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 2))
	for name, make1 := range cones() {
		c := make1()
		for range 10 {
			p, q, r := inside(make1(), rng), inside(make1(), rng), make([]float64, c.dim())
			c.scale(p, q)
			c.corrector(r, 0, nil, nil)
			for k := range r {
				r[k] = -r[k]
			}
			if e := apart(p, r); e > 1e-9 {
				t.Errorf("%s: the corrector for 0 is off -p by %g", name, e)
			}
			const mu = 0.3
			c.corrector(r, mu, nil, nil)
			for k := range r {
				r[k] += p[k]
			}
			if a, b := dot(r, q), mu*c.degree(); math.Abs(a-b) > 1e-9*(1+b) {
				t.Errorf("%s: <mu q^-1, q> = %g, want %g", name, a, b)
			}
		}
	}
}

// A step ends on the boundary: a little less is inside, a little more is not.
func TestStepReachesTheBoundary(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 3))
	for name, make1 := range cones() {
		c := make1()
		bounded := 0
		for range 30 {
			p, q := inside(make1(), rng), inside(make1(), rng)
			c.scale(p, q)
			dp, dq := make([]float64, c.dim()), make([]float64, c.dim())
			for k := range dp {
				dp[k], dq[k] = rng.NormFloat64(), rng.NormFloat64()
			}
			const limit = 100
			a := c.step(p, dp, q, dq, limit)
			at := func(share float64) bool {
				x, y := make([]float64, c.dim()), make([]float64, c.dim())
				for k := range x {
					x[k], y[k] = p[k]+share*a*dp[k], q[k]+share*a*dq[k]
				}
				return make1().scale(x, y)
			}
			if !at(0.9999) {
				t.Errorf("%s: %g of the step is outside", name, 0.9999)
			}
			if a < limit {
				bounded++
				if at(1.0001) {
					t.Errorf("%s: the step %g stops short", name, a)
				}
			}
		}
		if bounded == 0 {
			t.Errorf("%s: no step met the boundary", name)
		}
	}
}

func solve(t *testing.T, m *model.Model, o backends.Options) *model.Answer {
	t.Helper()
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	a, err := New().Solve(context.Background(), ComplexSheet, m, o)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// equality is sum coef x = side over complex entries.
func equality(side complex128, coef ...complex128) model.Constraint {
	row := model.Matrix{Start: []int{0, len(coef)}, Z: coef}
	for k := range coef {
		row.Col = append(row.Col, uint32(k))
	}
	return model.Constraint{Cone: model.Cone{Kind: model.Zero}, Map: model.Map{Field: model.Complex, Lin: row, Const: []complex128{-side}}}
}

// Corners of the form: nothing to decide, dependent rows, rows at odds, free directions of falling cost.
func TestCorners(t *testing.T) {
	z := []model.Block{{Field: model.Complex, Rows: 1, Cols: 1}}
	cost := model.Objective{Col: []uint32{0}, Coef: []complex128{1}}
	for _, c := range []struct {
		name string
		m    model.Model
		want model.Outcome
	}{
		{"nothing asked", model.Model{Blocks: z}, model.Optimal},
		{"one equality decides", model.Model{Blocks: z, Objective: cost, Constraints: []model.Constraint{equality(2+1i, 1)}}, model.Optimal},
		{"dependent equalities", model.Model{Blocks: z, Objective: cost, Constraints: []model.Constraint{equality(1, 1), equality(1i, 1i)}}, model.Optimal},
		{"z = 1, i z = 1", model.Model{Blocks: z, Constraints: []model.Constraint{equality(1, 1), equality(1, 1i)}}, model.Infeasible},
		{"0 = 1", model.Model{Blocks: z, Constraints: []model.Constraint{equality(1)}}, model.Infeasible},
		{"free and falling", model.Model{Blocks: z, Objective: cost}, model.Unbounded},
	} {
		a := solve(t, &c.m, backends.Options{})
		r := check.Examine(&c.m, a, check.Tolerances{})
		if a.Outcome != c.want || r.Verdict != check.Checked {
			t.Errorf("%s: %s, %s, want %s", c.name, a.Outcome, r, c.want)
		}
	}
}

// A solve that may not have the memory that is predicted of it is refused before it begins.
func TestMemoryIsRefusedBeforehand(t *testing.T) {
	m, _ := modeltest.Recipe{Seed: 3, Outcome: model.Optimal}.Make()
	m = &model.Model{Blocks: m.Blocks[:1], Constraints: nil}
	if _, err := New().Solve(context.Background(), ComplexSheet, m, backends.Options{MaxMemory: 1}); err == nil {
		t.Error("solved in one byte")
	}
}
