package endtoend

import (
	"math"
	"math/cmplx"
	"testing"

	"towpath/backends/interior"
	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"
)

// Every published instance goes down every route: natively, through the real-only sheet, to both sides of csdp, and where the
// broker chooses to send it.
// Sources are with the instances.
func TestInstances(t *testing.T) {
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	s := newStation(t)
	ways := []way{
		{"native", &towpathv1.JobOptions{Sheet: interior.ComplexSheet}, exactWay},
		{"real only", &towpathv1.JobOptions{Sheet: interior.RealSheet}, exactWay},
	}
	ways = append(ways, way{"chosen", &towpathv1.JobOptions{NeedMultipliers: true, NeedCertificates: true}, csdpWay})
	if s.csdp {
		ways = append(ways, way{"csdp", &towpathv1.JobOptions{Backends: []string{"csdp"}}, csdpWay})
	}
	for _, w := range ways {
		for _, c := range cases {
			t.Run(w.name+"/"+c.ID, func(t *testing.T) {
				sent, a := s.solve(t, c.Model, w.options)
				judge(t, &c, w.accuracy, sent, a)
			})
		}
	}
}

// way is one kind of route and what may be expected of it.
type way struct {
	name     string
	options  *towpathv1.JobOptions
	accuracy accuracy
}

// accuracy is what may be expected of a way beyond an instance's own tolerance, relative to 1 + size.
type accuracy struct{ value, multiplier, point float64 }

var (
	exactWay = accuracy{value: 1e-8, multiplier: 1e-5, point: 1e-4} // a point is as sharp as the root of its value
	csdpWay  = accuracy{value: 2e-7, multiplier: 1e-4, point: 1e-4}
)

func judge(t *testing.T, c *modeltest.Case, allowed accuracy, sent *towpathv1.Answer, a *model.Answer) {
	checked := sent.GetExamination().GetVerdict() == towpathv1.Verdict_VERDICT_CHECKED
	say := func() {
		t.Logf("%v, %v, objective %.12g: %s %v", a.Outcome, sent.GetExamination().GetVerdict(), a.Objective, a.Note, sent.GetExamination().GetReasons()[:min(3, len(sent.GetExamination().GetReasons()))])
	}
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
	const coarse = 1e-4 // published to so few digits because the optimum is hardly attained: doubt is honest there
	if !checked && c.Tolerance < coarse {
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
