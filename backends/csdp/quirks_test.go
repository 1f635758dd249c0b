package csdp

import (
	"context"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	"towpath/model/check"
)

// smallestEigenvalue is min tr(C X), tr X = trace, X psd for C = scale [2 1; 1 2], whose optimum is scale trace.
func smallestEigenvalue(scale, trace float64) *model.Model {
	return &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{0, 2 * scale}, term{1, 2 * scale}, term{2, 2 * scale}),
		Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{-trace}, []term{{0, 1}, {2, 1}})}}
}

// largestEigenvalue is min u, u I - scale [2 1; 1 2] psd, whose optimum is 3 scale.
func largestEigenvalue(scale float64) *model.Model {
	return &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, 1}),
		Constraints: []model.Constraint{in(model.Symmetric, model.PSD, []float64{-2 * scale, -scale, -2 * scale}, []term{{0, 1}}, nil, []term{{0, 1}})}}
}

// large is a model that keeps csdp busy: min tr(C X), diag X = 1 with a random C.
func large(n int) *model.Model {
	rng := rand.New(rand.NewPCG(1, 1))
	m := &model.Model{Blocks: []model.Block{psd(n)}}
	var diagonal [][]term
	var consts []float64
	at := uint32(0)
	for j := range n {
		diagonal, consts = append(diagonal, []term{{at, 1}}), append(consts, -1)
		for range n - j {
			m.Objective.Col, m.Objective.Coef = append(m.Objective.Col, at), append(m.Objective.Coef, complex(rng.NormFloat64(), 0))
			at++
		}
	}
	m.Constraints = []model.Constraint{in(model.Real, model.Zero, consts, diagonal...)}
	return m
}

// Entries off the diagonal stand for two: the eigenvalues of [2 1; 1 2] are 1 and 3.
func TestQuirkUpperTriangleOnly(t *testing.T) {
	d := installed(t)
	for sheet, c := range map[string]struct {
		m    *model.Model
		want float64
	}{EqualitySheet: {smallestEigenvalue(1, 1), 1}, InequalitySheet: {largestEigenvalue(1), 3}} {
		a, r := examined(t, d, sheet, c.m, backends.Options{})
		if a.Outcome != model.Optimal || r.Verdict != check.Checked || math.Abs(a.Objective-c.want) > 1e-6 || math.Abs(a.Bound-c.want) > 1e-6 {
			t.Errorf("%s: %s, objective %.9g, bound %.9g, want %g; %v", sheet, a.Outcome, a.Objective, a.Bound, c.want, r)
		}
	}
}

// csdp ends with "Success" on models whose two sides differ, at multipliers of size 1e10.
//
// The left side is min x00 with x11 = 0 and x00 + 2 x12 = 1: X psd makes x12 vanish with x11, so that the optimum is 1.
// The right side is sup y1 with E00 - y0 E11 - y1 (E00 + E12 + E21) psd: its entry (2,2) is 0, so y1 is 0, and so is the
// supremum. The inequality sheet gets the right side, as min y1 with E00 + y0 E11 + y1 (E00 + E12 + E21) psd, optimum 0.
// (A classic, after L. Vandenberghe and S. Boyd, Semidefinite Programming, SIAM Review 38, 1996; from memory.)
func TestQuirkSuccessAcrossADualityGap(t *testing.T) {
	d := installed(t)
	left := &model.Model{Blocks: []model.Block{psd(3)}, Objective: cost(0, term{0, 1}),
		Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{0, -1}, []term{{3, 1}}, []term{{0, 1}, {4, 2}})}}
	right := &model.Model{Blocks: []model.Block{free(2)}, Objective: cost(0, term{1, 1}),
		Constraints: []model.Constraint{in(model.Symmetric, model.PSD, []float64{1, 0, 0, 0, 0, 0},
			[]term{{1, 1}}, nil, nil, []term{{0, 1}}, []term{{1, 1}}, nil)}}
	for sheet, m := range map[string]*model.Model{EqualitySheet: left, InequalitySheet: right} {
		a, r := examined(t, d, sheet, m, backends.Options{})
		if r.Verdict == check.Checked || r.Verdict == check.Proved {
			t.Errorf("%s: the examiner trusts %s %.9g with bound %.9g", sheet, a.Outcome, a.Objective, a.Bound)
		}
	}
}

// Its "primal" is the left side and its "dual" the right one: on each sheet both words become what the model is, and what
// the file holds then is a certificate that the examiner accepts.
func TestQuirkPrimalAndDualInfeasible(t *testing.T) {
	d := installed(t)
	square := func(consts []float64, rows ...[]term) model.Constraint {
		return in(model.Symmetric, model.PSD, consts, rows...)
	}
	for _, c := range []struct {
		name  string
		sheet string
		want  model.Outcome
		m     *model.Model
	}{
		{"a negative trace", EqualitySheet, model.Infeasible, &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{0, 1}),
			Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{1}, []term{{0, 1}, {2, 1}})}}},
		{"minus the trace, x10 = 1", EqualitySheet, model.Unbounded, &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{0, -1}, term{2, -1}),
			Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{-1}, []term{{1, 1}})}}},
		{"a negative sum", EqualitySheet, model.Infeasible, &model.Model{Blocks: []model.Block{nonneg(2)}, Objective: cost(0, term{0, 1}),
			Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{1}, []term{{0, 1}, {1, 1}})}}},
		{"u >= 0 and u <= -1", InequalitySheet, model.Infeasible, &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, 1}),
			Constraints: []model.Constraint{square([]float64{0, 0, -1}, []term{{0, 1}}, nil, []term{{0, -1}})}}},
		{"minus u, [u 1; 1 u] psd", InequalitySheet, model.Unbounded, &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, -1}),
			Constraints: []model.Constraint{square([]float64{0, 1, 0}, []term{{0, 1}}, nil, []term{{0, 1}})}}},
		{"a row left out before, an infeasible rest", EqualitySheet, model.Infeasible, &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{0, 1}),
			Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{0, 1}, nil, []term{{0, 1}, {2, 1}})}}},
	} {
		t.Run(c.name, func(t *testing.T) {
			a, r := examined(t, d, c.sheet, c.m, backends.Options{})
			if a.Outcome != c.want || r.Verdict != check.Checked {
				t.Errorf("%s (%s), want %s; %v", a.Outcome, a.Note, c.want, r)
			}
			if a.Point != nil || a.Multipliers != nil || !math.IsNaN(a.Objective) || !math.IsNaN(a.Bound) {
				t.Errorf("a certificate comes with a solution: %+v", a)
			}
		})
	}
}

// [u 1; 1 0] psd holds for no u, but for all but a little as u grows: no certificate exists, and no claim may pass.
func TestQuirkWeakInfeasibility(t *testing.T) {
	d := installed(t)
	m := &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, 1}),
		Constraints: []model.Constraint{in(model.Symmetric, model.PSD, []float64{0, 1, 0}, []term{{0, 1}}, nil, nil)}}
	if a, r := examined(t, d, InequalitySheet, m, backends.Options{}); r.Verdict == check.Checked || r.Verdict == check.Proved {
		t.Errorf("the examiner trusts %s (%s)", a.Outcome, a.Note)
	}
}

// Under its own settings csdp calls feasible models with constants or costs beyond 1e8 infeasible or unbounded, with
// certificates so small that they pass. Up to 3e12 the answer must be right; beyond, only the truth may pass.
func TestQuirkLargeNumbers(t *testing.T) {
	d := installed(t)
	atLeast := func(b float64) *model.Model {
		return &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, 1}),
			Constraints: []model.Constraint{in(model.Real, model.Nonneg, []float64{-b}, []term{{0, 1}})}}
	}
	for _, c := range []struct {
		name  string
		sheet string
		make  func(size float64) *model.Model
		want  float64 // times size
	}{
		{"trace", EqualitySheet, func(s float64) *model.Model { return smallestEigenvalue(1, s) }, 1},
		{"costs", EqualitySheet, func(s float64) *model.Model { return smallestEigenvalue(s, 1) }, 1},
		{"constants", InequalitySheet, largestEigenvalue, 3},
		{"a limit", InequalitySheet, atLeast, 1},
	} {
		for _, size := range []float64{1e6, 1e8, 1e9, 1e10, 3e12, 1e20, 1e50, 1e99} {
			a, r := examined(t, d, c.sheet, c.make(size), backends.Options{})
			right := a.Outcome == model.Optimal && math.Abs(a.Objective/(c.want*size)-1) <= 1e-5
			checked := r.Verdict == check.Checked
			if checked && !right || size <= 3e12 && !checked {
				t.Errorf("%s of size %g: %s %.9g (%s), %s; the optimum is %g", c.name, size, a.Outcome, a.Objective, a.Note, r.Verdict, c.want*size)
			}
		}
	}
}

// The cure for large numbers leaves csdp its certificates where there are some.
func TestQuirkLargeNumbersTrulyInfeasible(t *testing.T) {
	d := installed(t)
	for _, size := range []float64{1, 1e9, 3e12} {
		for name, c := range map[string]struct {
			sheet string
			m     *model.Model
			want  model.Outcome
		}{
			"u >= size, u <= 0": {InequalitySheet, &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, 1}),
				Constraints: []model.Constraint{in(model.Real, model.Nonneg, []float64{-size, 0}, []term{{0, 1}}, []term{{0, -1}})}}, model.Infeasible},
			"trace -size": {EqualitySheet, smallestEigenvalue(1, -size), model.Infeasible},
			"minus size times the trace": {EqualitySheet, &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{0, -size}, term{2, -size}),
				Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{-1}, []term{{1, 1}})}}, model.Unbounded},
			"minus size times u, u >= 0": {InequalitySheet, &model.Model{Blocks: []model.Block{free(1)}, Objective: cost(0, term{0, -size}),
				Constraints: []model.Constraint{in(model.Real, model.Nonneg, nil, []term{{0, 1}})}}, model.Unbounded},
		} {
			if a, r := examined(t, d, c.sheet, c.m, backends.Options{}); a.Outcome != c.want || r.Verdict != check.Checked {
				t.Errorf("%s, size %g: %s (%s), want %s; %v", name, size, a.Outcome, a.Note, c.want, r)
			}
		}
	}
}

// Stored zeros are empty rows to csdp, which refuses them: they are left out, and the rest is solved.
func TestQuirkEmptyRowsAreRefused(t *testing.T) {
	d := installed(t)
	m := smallestEigenvalue(1, 1)
	m.Constraints = append([]model.Constraint{in(model.Real, model.Zero, []float64{0, 1e-17, 0}, nil, []term{{0, 0}}, []term{{1, 0}, {2, 0}})}, m.Constraints...)
	n := largestEigenvalue(1)
	n.Blocks = append(n.Blocks, free(2))
	n.Constraints[0].Map.Lin = in(model.Real, model.Zero, nil, []term{{0, 1}, {1, 0}}, nil, []term{{0, 1}}).Map.Lin
	for sheet, c := range map[string]struct {
		m    *model.Model
		want float64
	}{EqualitySheet: {m, 1}, InequalitySheet: {n, 3}} {
		a, r := examined(t, d, sheet, c.m, backends.Options{})
		if a.Outcome != model.Optimal || r.Verdict != check.Checked || math.Abs(a.Objective-c.want) > 1e-6 {
			t.Errorf("%s: %s %.9g, want %g; %v", sheet, a.Outcome, a.Objective, c.want, r)
		}
	}
}

// csdp takes param.csdp from the current directory: the server's must not count, ours must.
func TestQuirkParametersComeFromTheDirectory(t *testing.T) {
	d := installed(t)
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "param.csdp"), []byte("maxiter=1\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	t.Chdir(dir)
	m := smallestEigenvalue(1, 1)
	if a, r := examined(t, d, EqualitySheet, m, backends.Options{}); a.Outcome != model.Optimal || r.Verdict != check.Checked {
		t.Errorf("a file in the server's directory counts: %s after %d iterations; %v", a.Outcome, a.Iterations, r)
	}
	a, r := examined(t, d, EqualitySheet, m, backends.Options{MaxIterations: 2})
	if a.Outcome != model.Inaccurate || a.Iterations > 2 || a.Point == nil || r.Verdict == check.Checked {
		t.Errorf("two iterations: %s after %d; %v", a.Outcome, a.Iterations, r)
	}
	if left, err := os.ReadDir(dir); err != nil || len(left) != 1 {
		t.Errorf("the server's directory has %v, %v", left, err)
	}
}

// Asked for more than perturbobj=1 lets it reach, csdp ends stuck: that is no error, and never refuted.
func TestQuirkTightToleranceEndsStuck(t *testing.T) {
	d := installed(t)
	m := large(30)
	plain, r := examined(t, d, EqualitySheet, m, backends.Options{})
	if r.Verdict != check.Checked {
		t.Fatal(r)
	}
	a, r := examined(t, d, EqualitySheet, m, backends.Options{Tolerance: 1e-13})
	if a.Outcome != model.Inaccurate && a.Outcome != model.Optimal || r.Verdict == check.Refuted {
		t.Errorf("%s (%s); %v", a.Outcome, a.Note, r)
	}
	if math.Abs(a.Objective-plain.Objective) > 1e-5*(1+math.Abs(plain.Objective)) {
		t.Errorf("objective %.9g, at the default tolerance %.9g", a.Objective, plain.Objective)
	}
}

// csdp has no limit of time and writes nothing when it is stopped: it is killed, and the answer is Stopped without a point.
func TestQuirkDiesWithoutAFile(t *testing.T) {
	d := installed(t)
	m := large(300)
	stopped := func(t *testing.T, a *model.Answer, err error) {
		t.Helper()
		if err != nil || a.Outcome != model.Stopped || a.Point != nil || a.Multipliers != nil || a.Note == "" {
			t.Errorf("%+v, %v", a, err)
		}
	}
	t.Run("withdrawn", func(t *testing.T) {
		ctx, cancel := context.WithCancel(t.Context())
		defer cancel()
		reports := 0
		a, err := solve(ctx, t, d, EqualitySheet, m, backends.Options{Progress: func(backends.Progress) {
			reports++
			cancel()
		}})
		stopped(t, a, err)
		if reports == 0 {
			t.Error("it was not running yet")
		}
	})
	t.Run("past the deadline", func(t *testing.T) {
		ctx, cancel := context.WithTimeout(t.Context(), 30*time.Millisecond)
		defer cancel()
		a, err := solve(ctx, t, d, EqualitySheet, m, backends.Options{})
		stopped(t, a, err)
	})
}
