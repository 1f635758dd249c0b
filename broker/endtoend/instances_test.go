package endtoend

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"
)

// Every published instance goes down every route: natively, through the real-only sheet, and to both sides of csdp.
// Sources are with the instances.
func TestInstances(t *testing.T) {
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	s := newStation(t)
	for _, sheet := range s.sheets {
		for _, c := range cases {
			t.Run(sheet+"/"+c.ID, func(t *testing.T) {
				sent, a := s.solve(t, c.Model, &towpathv1.JobOptions{Sheet: sheet})
				if got := sent.GetRoute().GetSheet(); got != sheet {
					t.Fatalf("went to %s", got)
				}
				judge(t, &c, accuracyOf(sheet), sent, a)
			})
		}
	}
}

// accuracy is what may be expected of a sheet beyond the instance's own tolerance.
type accuracy struct{ value, multiplier, point float64 }

func accuracyOf(sheet string) accuracy {
	if strings.HasPrefix(sheet, "csdp/") {
		return accuracy{value: 2e-7, multiplier: 1e-4, point: 1e-4}
	}
	return accuracy{value: 1e-8, multiplier: 1e-6, point: 1e-5}
}

func judge(t *testing.T, c *modeltest.Case, allowed accuracy, sent *towpathv1.Answer, a *model.Answer) {
	checked := sent.GetExamination().GetVerdict() == towpathv1.Verdict_VERDICT_CHECKED
	say := func() { t.Logf("%v, %v, objective %.12g: %s %v", a.Outcome, sent.GetExamination().GetVerdict(), a.Objective, a.Note, sent.GetExamination().GetReasons()) }
	switch {
	case c.Status == "infeasible" || c.Status == "unbounded":
		if a.Outcome.String() != c.Status || !checked {
			t.Errorf("want %s, checked", c.Status)
			say()
		}
		return
	case c.Status != "optimal": // weakly infeasible, or a gap between primal and dual: no claim can be checked
		if a.Outcome == model.Infeasible || a.Outcome == model.Unbounded || checked {
			t.Errorf("the model is %s: nothing can be claimed of it", c.Status)
			say()
		}
		return
	}
	scale := 1 + math.Abs(c.Value)
	off := math.Abs(a.Objective-c.Value) / scale
	if c.Pathological { // an optimum that double precision can hardly reach: a checked answer must still be right
		if checked && !(off <= 1e-3) {
			t.Errorf("objective %.12g, want %.12g", a.Objective, c.Value)
			say()
		}
		return
	}
	if !checked {
		t.Error("not checked")
		say()
	}
	if limit := max(c.Tolerance, allowed.value); !(off <= limit) {
		t.Errorf("objective %.12g, want %.12g: off by %.2g, allowed %.2g", a.Objective, c.Value, off, limit)
		say()
	}
	for k := range c.Model.Constraints {
		name := c.Model.Constraints[k].Name
		if want, known := c.Dual[name]; known && a.Multipliers != nil {
			compare(t, "multiplier of "+name, a.Multipliers.Constraints[k], want, allowed.multiplier)
		}
	}
	for k := range c.Model.Blocks {
		name := c.Model.Blocks[k].Name
		if want, known := c.Primal[name]; known && a.Point != nil {
			compare(t, "value of "+name, a.Point.Values[k], want, allowed.point)
		}
	}
}

func compare(t *testing.T, what string, got, want []complex128, allowed float64) {
	t.Helper()
	off, size := 0.0, 1.0
	for i := range want {
		off, size = max(off, cmplx.Abs(got[i]-want[i])), max(size, cmplx.Abs(want[i]))
	}
	if !(off <= allowed*size) {
		t.Errorf("%s is off by %.2g, allowed %.2g\n got %.9v\nwant %.9v", what, off, allowed*size, got, want)
	}
}
