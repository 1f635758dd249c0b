package check_test

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"
	"testing"

	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

// spoiled lists what can be wrong with an answer. Each changes the answer where that is possible and says where.
var spoiled = []struct {
	name  string
	spoil func(*model.Model, *model.Answer) (place string, done bool)
}{
	{"multipliers conjugated", eachMultiplier(cmplx.Conj)},
	{"multipliers halved", eachMultiplier(func(z complex128) complex128 { return z / 2 })},
	{"multipliers negated", eachMultiplier(func(z complex128) complex128 { return -z })},
	{"imaginary parts of multipliers lost", eachMultiplier(func(z complex128) complex128 { return complex(real(z), 0) })},
	{"point conjugated", eachValue(cmplx.Conj)},
	{"point moved", eachValue(func(z complex128) complex128 { return z + 1e-2 })},
	{"point doubled", eachValue(func(z complex128) complex128 { return 2 * z })},
	{"objective off", func(_ *model.Model, a *model.Answer) (string, bool) {
		a.Objective += 1e-3 * (1 + math.Abs(a.Objective))
		return "", true
	}},
	{"bound off", func(_ *model.Model, a *model.Answer) (string, bool) {
		a.Bound -= 1e-3 * (1 + math.Abs(a.Bound))
		return "", true
	}},
	{"multipliers of bounds lost", func(m *model.Model, a *model.Answer) (string, bool) {
		changed := false
		for b := range a.Multipliers.Bounds {
			for k, z := range a.Multipliers.Bounds[b] {
				changed = changed || z != 0
				a.Multipliers.Bounds[b][k] = 0
			}
		}
		return "", changed
	}},
	{"no point", func(_ *model.Model, a *model.Answer) (string, bool) { a.Point = nil; return "", true }},
	{"no multipliers", func(_ *model.Model, a *model.Answer) (string, bool) { a.Multipliers = nil; return "", true }},
	{"NaN in the point", func(m *model.Model, a *model.Answer) (string, bool) {
		a.Point.Values[0][0] = complex(math.NaN(), 0)
		return "block 0", true
	}},
	{"infinite multiplier", func(m *model.Model, a *model.Answer) (string, bool) {
		a.Multipliers.Constraints[0][0] = complex(math.Inf(1), 0)
		return "constraint 0", true
	}},
	{"short block", func(m *model.Model, a *model.Answer) (string, bool) {
		a.Point.Values[0] = a.Point.Values[0][:0]
		return "block 0", true
	}},
	{"missing constraint", func(m *model.Model, a *model.Answer) (string, bool) {
		a.Multipliers.Constraints = a.Multipliers.Constraints[1:]
		return fmt.Sprintf("for %d constraints, the model has %d", len(m.Constraints)-1, len(m.Constraints)), true
	}},
	{"called infeasible", func(_ *model.Model, a *model.Answer) (string, bool) {
		a.Outcome, a.Farkas = model.Infeasible, a.Multipliers
		return "", true
	}},
	{"called unbounded", func(_ *model.Model, a *model.Answer) (string, bool) {
		a.Outcome, a.Ray = model.Unbounded, a.Point
		return "", true
	}},
}

// eachMultiplier changes all multipliers of constraints.
func eachMultiplier(change func(complex128) complex128) func(*model.Model, *model.Answer) (string, bool) {
	return func(m *model.Model, a *model.Answer) (string, bool) {
		changed := false
		for _, y := range a.Multipliers.Constraints {
			for r, z := range y {
				y[r] = change(z)
				changed = changed || cmplx.Abs(y[r]-z) > 1e-2
			}
		}
		return "", changed
	}
}

// eachValue changes all values, of real entries the real part only.
func eachValue(change func(complex128) complex128) func(*model.Model, *model.Answer) (string, bool) {
	return func(m *model.Model, a *model.Answer) (string, bool) {
		changed := false
		for b, v := range a.Point.Values {
			for k, z := range v {
				v[k] = change(z)
				if m.Blocks[b].RealEntry(k) {
					v[k] = complex(real(v[k]), 0)
				}
				changed = changed || cmplx.Abs(v[k]-z) > 1e-3
			}
		}
		return "", changed
	}
}

// TestSpoiledAnswersDoNotPass spoils the known answers of random models of every kind. A spoiled answer may, by chance, be
// another right one, where multipliers or points are not unique or vanish; then its value must be the known one.
func TestSpoiledAnswersDoNotPass(t *testing.T) {
	for _, s := range spoiled {
		t.Run(s.name, func(t *testing.T) {
			tried, passed := 0, 0
			for seed := range uint64(150) {
				r := modeltest.Recipe{Seed: seed, Outcome: model.Optimal}
				m, a := r.Make()
				place, done := s.spoil(m, a)
				if !done {
					continue
				}
				tried++
				report := check.Examine(m, a, check.Tolerances{})
				if report.Verdict == check.Checked {
					passed++
					_, known := r.Make()
					if off := math.Abs(a.Objective-known.Objective) / (1 + math.Abs(known.Objective)); !(off <= 1e-5) || a.Outcome != model.Optimal {
						t.Errorf("%s: passed with objective %g, it is %g", r, a.Objective, known.Objective)
					}
					continue
				}
				if len(report.Reasons) == 0 {
					t.Errorf("%s: %s for no reason", r, report.Verdict)
				} else if place != "" && !contains(report.Reasons, place) {
					t.Errorf("%s: %q is not named in %q", r, place, report.Reasons)
				}
			}
			if tried == 0 || 10*passed > tried {
				t.Errorf("%d of %d spoiled answers passed", passed, tried)
			}
		})
	}
}

func contains(lines []string, word string) bool {
	return slices.ContainsFunc(lines, func(l string) bool { return strings.Contains(l, word) })
}

// What is off is named: one row of one constraint, one multiplier, one bound.
func TestTheSpoiledPlaceIsNamed(t *testing.T) {
	m := &model.Model{
		Blocks: []model.Block{{Name: "z", Field: model.Complex, Rows: 1, Cols: 1, Bounds: &model.Bounds{Lower: []complex128{complex(math.Inf(-1), 0)}, Upper: []complex128{complex(2, math.Inf(1))}}}},
		// maximize Re z, Re z <= 2, Im z >= 0, Im z = 1
		Objective: model.Objective{Sense: model.Maximize, Col: []uint32{0}, Coef: []complex128{1}},
		Constraints: []model.Constraint{{Name: "tide", Cone: model.Cone{Kind: model.Zero},
			Map: model.Map{Field: model.Real, Lin: model.Matrix{Start: []int{0, 1}, Col: []uint32{0}, Z: []complex128{-1i}}, Const: []complex128{-1}}}},
	}
	good := func() *model.Answer {
		return &model.Answer{Outcome: model.Optimal, Objective: 2, Bound: 2, Point: &model.Point{Values: [][]complex128{{2 + 1i}}},
			Multipliers: &model.Multipliers{Constraints: [][]complex128{{0}}, Bounds: [][]complex128{{-1}}}}
	}
	if r := check.Examine(m, good(), check.Tolerances{}); r.Verdict != check.Checked || r.Objective != 2 || r.Bound != 2 {
		t.Fatalf("the right answer: %s", r)
	}
	for _, c := range []struct {
		name, want string
		spoil      func(*model.Answer)
	}{
		{"row missed", "constraint 0 'tide': relative distance of its rows from the cone", func(a *model.Answer) { a.Point.Values[0][0] = 2 + 2i }},
		{"bound missed", "block 0 'z': relative violation of its bounds", func(a *model.Answer) { a.Point.Values[0][0] = 3 + 1i }},
		{"stationarity missed", "block 0 'z': relative distance of its reduced cost from the dual cone", func(a *model.Answer) { a.Multipliers.Constraints[0][0] = 1 }},
		{"sign of a bound's multiplier", "block 0 'z'", func(a *model.Answer) { a.Multipliers.Bounds[0][0] = 1 }},
		{"claim", "relative difference of the claimed objective", func(a *model.Answer) { a.Objective = 3 }},
	} {
		a := good()
		c.spoil(a)
		r := check.Examine(m, a, check.Tolerances{})
		if r.Verdict == check.Checked || !contains(r.Reasons, c.want) {
			t.Errorf("%s: %s, want %q", c.name, r, c.want)
		}
	}
}
