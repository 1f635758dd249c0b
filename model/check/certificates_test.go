package check_test

import (
	"math"
	"math/cmplx"
	"testing"

	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

// TestSpoiledCertificatesDoNotPass spoils known certificates.
func TestSpoiledCertificatesDoNotPass(t *testing.T) {
	for _, s := range []struct {
		name   string
		change func(complex128) complex128
	}{
		{"negated", func(z complex128) complex128 { return -z }},
		{"moved", func(z complex128) complex128 { return z + 0.01 }},
		{"conjugated", cmplx.Conj},
		{"vanished", func(complex128) complex128 { return 0 }},
		{"NaN", func(complex128) complex128 { return complex(math.NaN(), 0) }},
	} {
		tried, passed := 0, 0
		for seed := range uint64(100) {
			for _, outcome := range []model.Outcome{model.Infeasible, model.Unbounded} {
				m, a := modeltest.Recipe{Seed: seed, Outcome: outcome}.Make()
				changed := false
				spoil := func(v []complex128, real0 func(int) bool) {
					for k, z := range v {
						v[k] = s.change(z)
						if real0(k) {
							v[k] = complex(real(v[k]), 0)
						}
						changed = changed || !(cmplx.Abs(v[k]-z) < 5e-3)
					}
				}
				if outcome == model.Infeasible {
					for k := range m.Constraints {
						spoil(a.Farkas.Constraints[k], m.Constraints[k].RealRow)
					}
				} else {
					for b := range m.Blocks {
						spoil(a.Ray.Values[b], m.Blocks[b].RealEntry)
					}
				}
				if !changed {
					continue
				}
				tried++
				if check.Examine(m, a, check.Tolerances{}).Verdict == check.Checked {
					passed++
				}
			}
		}
		// A ray of a pointed set of rays may stay one when it is moved a little or conjugated; multipliers never do, the
		// contradiction holds for one combination only.
		if allowed := tried / 10; tried < 50 || passed > allowed {
			t.Errorf("%s: %d of %d passed", s.name, passed, tried)
		}
	}
}

// Known certificates of the published instances pass; those of weakly infeasible models, which have none, do not.
func TestKnownCertificates(t *testing.T) {
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	good, bad := 0, 0
	for _, c := range cases {
		if len(c.Certificate) == 0 {
			continue
		}
		y := &model.Multipliers{Bounds: make([][]complex128, len(c.Model.Blocks))}
		for k := range c.Model.Constraints {
			v := c.Certificate[c.Model.Constraints[k].Name]
			if v == nil {
				v = make([]complex128, c.Model.Constraints[k].Map.Rows())
			}
			y.Constraints = append(y.Constraints, v)
		}
		r := check.Examine(c.Model, &model.Answer{Outcome: model.Infeasible, Objective: math.NaN(), Bound: math.NaN(), Farkas: y}, check.Tolerances{})
		switch c.Status {
		case "infeasible":
			good++
			if r.Verdict != check.Checked {
				t.Errorf("%s: %s", c.ID, r)
			}
		default:
			bad++
			if r.Verdict == check.Checked {
				t.Errorf("%s is %s, and its certificate passes: %s", c.ID, c.Status, r)
			}
		}
	}
	if good == 0 {
		t.Error("no known certificate was tried")
	}
	t.Logf("%d certificates of infeasible models, %d of others", good, bad)
}

// [[x, i], [-i, 0]] is never positive semidefinite and has no certificate, only multipliers Y = [[e, i/2], [-i/2, 1/(4e)]]
// whose residual e goes to zero while they grow. However small the residual, they must not pass.
func TestWeakInfeasibilityIsNotInfeasibility(t *testing.T) {
	m := &model.Model{
		Blocks: []model.Block{{Name: "x", Field: model.Real, Rows: 1, Cols: 1}},
		Constraints: []model.Constraint{{Name: "matrix", Cone: model.Cone{Kind: model.PSD}, Map: model.Map{Field: model.Hermitian,
			Lin:   model.Matrix{Start: []int{0, 1, 1, 1}, Col: []uint32{0}, Z: []complex128{1}},
			Const: []complex128{0, -1i, 0}}}},
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	for _, e := range []float64{1e-2, 1e-5, 3e-11, 1e-15} {
		// packed (0,0), (1,0), (1,1); <Y, F(0)> = 2 Re(conj(y10) (-i)) must be -1
		y := []complex128{complex(e, 0), 0.5i, complex(1/(4*e), 0)}
		a := &model.Answer{Outcome: model.Infeasible, Objective: math.NaN(), Bound: math.NaN(), Farkas: &model.Multipliers{Constraints: [][]complex128{y}}}
		if r := check.Examine(m, a, check.Tolerances{}); r.Verdict == check.Checked || r.CertificateResidue > 2*e+1e-15/e { // rounding of the large entry
			t.Errorf("residual %g: %s", e, r)
		}
	}
}

// Small numbers do not make a certificate: x - 1e7 >= 0, 1e-9 x - 1 >= 0 and the like have solutions, alone and beside a
// contradiction of which the certificate makes no use; maximizing x under 1e-7 x <= 1 has an optimum.
func TestSmallNumbersAreNoCertificate(t *testing.T) {
	row := func(coef, constant float64) model.Constraint {
		return model.Constraint{Cone: model.Cone{Kind: model.Nonneg}, Map: model.Map{
			Lin: model.Matrix{Start: []int{0, 1}, Col: []uint32{0}, Re: []float64{coef}}, Const: []complex128{complex(constant, 0)}}}
	}
	nan := math.NaN()
	one := []model.Block{{Field: model.Real, Rows: 1, Cols: 1}}
	for _, c := range []struct{ coef, constant, y float64 }{{1, -1e7, 1e-7}, {1e-9, -1, 1}, {1e-12, -1e-3, 1e3}} {
		m := &model.Model{Blocks: one, Constraints: []model.Constraint{row(c.coef, c.constant)}}
		y := &model.Multipliers{Constraints: [][]complex128{{complex(c.y, 0)}}}
		if r := check.Examine(m, &model.Answer{Outcome: model.Infeasible, Objective: nan, Bound: nan, Farkas: y}, check.Tolerances{}); r.Verdict == check.Checked {
			t.Errorf("%g x + %g >= 0, multiplier %g: %s", c.coef, c.constant, c.y, r)
		}
		// beside two rows that cancel and prove nothing
		m = &model.Model{Blocks: []model.Block{{Field: model.Real, Rows: 1, Cols: 1}, {Field: model.Real, Rows: 1, Cols: 1}}, Constraints: []model.Constraint{row(c.coef, c.constant), row(1, 0), row(-1, 0)}}
		m.Constraints[1].Map.Lin.Col[0], m.Constraints[2].Map.Lin.Col[0] = 1, 1
		y = &model.Multipliers{Constraints: [][]complex128{{complex(c.y, 0)}, {1}, {1}}}
		if r := check.Examine(m, &model.Answer{Outcome: model.Infeasible, Objective: nan, Bound: nan, Farkas: y}, check.Tolerances{}); r.Verdict == check.Checked {
			t.Errorf("%g x + %g >= 0, multiplier %g, in company: %s", c.coef, c.constant, c.y, r)
		}
	}
	m := &model.Model{Blocks: one, Objective: model.Objective{Sense: model.Maximize, Col: []uint32{0}, Coef: []complex128{1}}, Constraints: []model.Constraint{row(-1e-7, 1)}}
	if r := check.Examine(m, &model.Answer{Outcome: model.Unbounded, Objective: nan, Bound: nan, Ray: &model.Point{Values: [][]complex128{{1}}}}, check.Tolerances{}); r.Verdict == check.Checked {
		t.Errorf("1e-7 x <= 1 bounds x: %s", r)
	}
}

// A claim without its certificate is no claim, and a certificate that proves nothing is refuted.
func TestClaimsNeedCertificates(t *testing.T) {
	m, _ := modeltest.Recipe{Seed: 1, Outcome: model.Optimal}.Make()
	nan := math.NaN()
	for _, o := range []model.Outcome{model.Infeasible, model.Unbounded, model.Optimal, model.Inaccurate, model.Stopped, model.OutcomeUnknown} {
		if r := check.Examine(m, &model.Answer{Outcome: o, Objective: nan, Bound: nan}, check.Tolerances{}); r.Verdict == check.Checked || len(r.Reasons) == 0 {
			t.Errorf("%s with nothing: %s", o, r)
		}
	}
	if r := check.Examine(m, nil, check.Tolerances{}); r.Verdict != check.Refuted {
		t.Errorf("no answer: %s", r)
	}
}
