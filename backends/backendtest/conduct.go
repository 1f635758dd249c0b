package backendtest

import (
	"context"
	"errors"
	"math"
	"sync"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	"towpath/model/modeltest"
)

// reachable is the first random optimal model that has a way to the sheet and makes the driver work: one that is settled
// at sight, having no rows left, shows nothing.
func (s *sheet) reachable(t *testing.T) crossed {
	t.Helper()
	for seed := range uint64(50) {
		m, _ := modeltest.Recipe{Seed: seed, Outcome: model.Optimal, Linear: seed%2 == 1}.Make()
		x, ok := s.cross(t, m)
		if !ok {
			continue
		}
		works := false
		if _, _, err := s.solve(t.Context(), x, backends.Options{Progress: func(backends.Progress) { works = true }}); err == nil && works {
			return x
		}
	}
	t.Fatal("no model makes the driver work and report")
	return crossed{}
}

// withdrawal: a context that has ended, or ends at any moment of the solve, gives Stopped or a whole answer, soon.
func (s *sheet) withdrawal(t *testing.T) {
	x := s.reachable(t)
	gone, cancel := context.WithCancel(t.Context())
	cancel()
	a, _, err := s.solve(gone, x, backends.Options{})
	if err != nil || a.Outcome != model.Stopped {
		t.Errorf("withdrawn before the start: %v, %v", a, err)
	}
	late, cancel := context.WithDeadline(t.Context(), time.Now().Add(-time.Second))
	defer cancel()
	if a, _, err := s.solve(late, x, backends.Options{}); err != nil || a.Outcome != model.Stopped {
		t.Errorf("past its deadline: %v, %v", a, err)
	}
	for after := range 4 {
		ctx, cancel := context.WithCancel(t.Context())
		steps := 0
		a, _, err := s.solve(ctx, x, backends.Options{Progress: func(backends.Progress) {
			if steps++; steps == after+1 {
				cancel()
			}
		}})
		cancel()
		if err != nil {
			t.Errorf("withdrawn after iteration %d: %v", after, err)
			continue
		}
		if a.Outcome != model.Stopped && a.Outcome != model.Optimal {
			t.Errorf("withdrawn after iteration %d: %s", after, a.Outcome)
		}
	}
}

// limits: few iterations and little memory give an honest outcome or an error, never a panic or a false claim.
func (s *sheet) limits(t *testing.T) {
	x := s.reachable(t)
	a, _, err := s.solve(t.Context(), x, backends.Options{MaxMemory: 1})
	if err == nil && a.Outcome == model.Optimal {
		t.Error("solved in one byte")
	}
	if s.expect.NoIterations {
		return
	}
	a, _, err = s.solve(t.Context(), x, backends.Options{MaxIterations: 1})
	if err != nil {
		t.Errorf("one iteration: %v", err)
	} else if a.Outcome == model.Optimal || a.Iterations > 1 {
		t.Errorf("one iteration: %s after %d", a.Outcome, a.Iterations)
	}
}

// company: solves side by side give, to the last bit, what they give alone.
func (s *sheet) company(t *testing.T) {
	x := s.reachable(t)
	alone, _, err := s.solve(t.Context(), x, backends.Options{})
	if err != nil {
		t.Fatal(err)
	}
	const guests = 4
	var wg sync.WaitGroup
	errs := make([]error, guests)
	for g := range guests {
		wg.Go(func() {
			a, err := s.driver.Solve(t.Context(), s.Name, x.Lowered, backends.Options{})
			switch {
			case err != nil:
				errs[g] = err
			case !same(x.Lift(a), alone):
				errs[g] = errors.New("another answer than alone")
			}
		})
	}
	wg.Wait()
	if err := errors.Join(errs...); err != nil {
		t.Error(err)
	}
}

// progress: iterations and time never go back, residuals are never negative.
func (s *sheet) progress(t *testing.T) {
	x := s.reachable(t)
	var seen []backends.Progress
	if _, _, err := s.solve(t.Context(), x, backends.Options{Progress: func(p backends.Progress) { seen = append(seen, p) }}); err != nil {
		t.Fatal(err)
	}
	for k, p := range seen {
		if p.Gap < 0 || p.PrimalResidual < 0 || p.DualResidual < 0 || math.IsInf(p.Primal, 0) {
			t.Errorf("report %d: %+v", k, p)
		}
		if k > 0 && (p.Iteration < seen[k-1].Iteration || p.Elapsed < seen[k-1].Elapsed) {
			t.Errorf("report %d goes back: %+v after %+v", k, p, seen[k-1])
		}
	}
}
