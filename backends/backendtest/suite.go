package backendtest

import (
	"context"
	"fmt"
	"math"
	"reflect"
	"testing"

	"towpath/backends"
	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

// Expect is what a driver is held to beyond the contract.
type Expect struct {
	// Instances and Random are the least shares of known answers that must come back as what they are and pass
	// examination: of the published instances that are neither pathological nor without a sound answer, and of the
	// random models.
	Instances, Random float64
	// Seeds is the number of random models of each outcome; 0 means 40.
	Seeds int
	// Spread is the largest scaling of random models, in powers of ten.
	Spread float64
	// NoIterations says that the driver cannot limit its iterations.
	NoIterations bool
}

// Run holds a driver to the contract, sheet by sheet. Models reach a sheet over the cheapest route that the catalogue of
// bridges has; the answer is lifted and examined against the model as it was written.
func Run(t *testing.T, d backends.Driver, e Expect) {
	if e.Seeds == 0 {
		e.Seeds = 40
	}
	if testing.Short() {
		e.Seeds = min(e.Seeds, 10)
	}
	sheets := d.Sheets()
	if len(sheets) == 0 {
		t.Fatal("the driver has no sheet")
	}
	for i := range sheets {
		s := &sheet{driver: d, Sheet: &sheets[i], expect: e}
		t.Run(s.Name, func(t *testing.T) {
			t.Run("declares itself", s.declares)
			t.Run("instances", s.instances)
			t.Run("random models", s.random)
			t.Run("withdrawal", s.withdrawal)
			t.Run("limits", s.limits)
			t.Run("company", s.company)
			t.Run("progress", s.progress)
		})
	}
	t.Run("unknown sheet", func(t *testing.T) {
		m, _ := modeltest.Recipe{Outcome: model.Optimal, Linear: true}.Make()
		if a, err := d.Solve(context.Background(), "nobody/has-this", m, backends.Options{}); err == nil {
			t.Errorf("answered %v under a sheet that it does not have", a.Outcome)
		}
	})
}

// sheet is one sheet under test.
type sheet struct {
	*capability.Sheet
	driver backends.Driver
	expect Expect
}

// declares: names, kinds and tolls are such that the broker can plan with them.
func (s *sheet) declares(t *testing.T) {
	if s.Backend == "" || s.Version == "" || len(s.Takes) == 0 || s.Toll == nil {
		t.Fatalf("back end '%s', version '%s', %d kinds", s.Backend, s.Version, len(s.Takes))
	}
	if s.Returns&capability.LiftsValues == 0 || !(s.Accuracy > 0 && s.Accuracy < 1e-2) {
		t.Errorf("returns %b with accuracy %g", s.Returns, s.Accuracy)
	}
	for _, k := range s.Kinds() {
		last := capability.Toll{}
		for _, n := range []int{1, 2, 5, 20, 100} {
			d := capability.Demand{Kind: k, Size: n, Count: 1}
			if k.Separable() {
				d.Size, d.Count = 1, n
			}
			toll := s.Toll(capability.Load{d})
			if !(toll.Seconds > 0 && toll.Bytes > 0) || math.IsInf(toll.Seconds, 0) {
				t.Errorf("%s of size %d costs %v", k, n, toll)
			}
			if toll.Seconds < last.Seconds || toll.Bytes < last.Bytes {
				t.Errorf("%s of size %d costs less than a smaller one", k, n)
			}
			last = toll
		}
	}
}

// crossed is a model on the far side of its route to the sheet.
type crossed struct {
	*bridges.Crossing
	model *model.Model
}

// cross takes a model to the sheet; ok is false when there is no way.
func (s *sheet) cross(t *testing.T, m *model.Model) (x crossed, ok bool) {
	t.Helper()
	var rules []capability.Rule
	for _, b := range bridges.All() {
		rules = append(rules, b)
	}
	p := capability.Plan(capability.Summarize(m), rules, []*capability.Sheet{s.Sheet}, capability.Options{})[0]
	if p.Route == nil {
		return x, false
	}
	c, err := bridges.Cross(m, p.Route, bridges.All())
	if err != nil {
		t.Fatalf("%s: %v", m.Name, err)
	}
	if err := c.Lowered.Validate(); err != nil {
		t.Fatalf("%s, lowered: %v", m.Name, err)
	}
	if err := s.Accepts(c.Lowered); err != nil {
		t.Fatalf("%s, lowered: %v", m.Name, err)
	}
	return crossed{c, m}, true
}

// solve runs the driver on a lowered model and examines what comes back. The lowered model must not be changed.
func (s *sheet) solve(ctx context.Context, x crossed, o backends.Options) (*model.Answer, check.Report, error) {
	before := modeltest.Copy(x.Lowered)
	a, err := s.driver.Solve(ctx, s.Name, x.Lowered, o)
	if err != nil {
		return nil, check.Report{}, err
	}
	if !reflect.DeepEqual(x.Lowered, before) {
		return nil, check.Report{}, fmt.Errorf("the driver changed its model")
	}
	lifted := x.Lift(a)
	return lifted, check.Examine(x.model, lifted, check.Tolerances{}), nil
}

// instances: no claim about a published instance that passes examination is false, and most are answered.
func (s *sheet) instances(t *testing.T) {
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	tally := tally{}
	for i := range cases {
		c := &cases[i]
		x, ok := s.cross(t, c.Model)
		if !ok {
			continue
		}
		a, report, err := s.solve(t.Context(), x, backends.Options{})
		if err != nil {
			t.Errorf("%s: %v", c.ID, err)
			continue
		}
		checked := report.Verdict == check.Checked
		switch {
		case c.Status == "infeasible" || c.Status == "unbounded":
			if checked && a.Outcome.String() != c.Status && a.Outcome != model.Inaccurate {
				t.Errorf("%s is %s; claimed, and checked: %s", c.ID, c.Status, a.Outcome)
			}
		case c.Status != "optimal": // nothing can be claimed of it
			if checked {
				t.Errorf("%s is %s; claimed, and checked: %s", c.ID, c.Status, a.Outcome)
			}
			continue
		default:
			if off := math.Abs(a.Objective-c.Value) / (1 + math.Abs(c.Value)); checked && !(off <= max(c.Tolerance, 1e-5)) {
				t.Errorf("%s: objective %.12g passed examination, it is %.12g", c.ID, a.Objective, c.Value)
			}
			if c.Pathological {
				continue
			}
		}
		tally.add(c.ID, checked, a, report)
	}
	tally.judge(t, s.expect.Instances)
}

// random: models built from their answer, of all outcomes.
func (s *sheet) random(t *testing.T) {
	tally := tally{}
	for seed := range uint64(s.expect.Seeds) {
		for _, outcome := range []model.Outcome{model.Optimal, model.Infeasible, model.Unbounded} {
			r := modeltest.Recipe{Seed: seed, Outcome: outcome, Linear: seed%2 == 0, Degenerate: seed%5 == 0, Spread: s.expect.Spread * float64(seed%4) / 3}
			m, known := r.Make()
			x, ok := s.cross(t, m)
			if !ok {
				continue
			}
			a, report, err := s.solve(t.Context(), x, backends.Options{})
			if err != nil {
				t.Errorf("%s: %v", r, err)
				continue
			}
			checked := report.Verdict == check.Checked
			if checked && a.Outcome != outcome && a.Outcome != model.Inaccurate {
				t.Errorf("%s: claimed, and checked: %s", r, a.Outcome)
			}
			if off := math.Abs(a.Objective-known.Objective) / (1 + math.Abs(known.Objective)); outcome == model.Optimal && checked && !(off <= 1e-5) {
				t.Errorf("%s: objective %.12g passed examination, it is %.12g", r, a.Objective, known.Objective)
			}
			tally.add(r.String(), checked, a, report)
		}
	}
	tally.judge(t, s.expect.Random)
}

// tally counts the models that were answered as they should be.
type tally struct {
	tried, right int
	missed       []string
}

func (y *tally) add(name string, checked bool, a *model.Answer, r check.Report) {
	y.tried++
	if checked {
		y.right++
		return
	}
	reason := ""
	if len(r.Reasons) > 0 {
		reason = r.Reasons[0]
	}
	y.missed = append(y.missed, fmt.Sprintf("%s: %s, %s: %s (%s)", name, a.Outcome, r.Verdict, reason, a.Note))
}

func (y *tally) judge(t *testing.T, share float64) {
	t.Helper()
	if y.tried == 0 {
		t.Fatal("no model reached the sheet")
	}
	t.Logf("%d of %d answered and checked", y.right, y.tried)
	for _, m := range y.missed {
		t.Log(m)
	}
	if float64(y.right) < share*float64(y.tried) {
		t.Errorf("%d of %d answered and checked, want a share of %g", y.right, y.tried, share)
	}
}

// same compares answers to the last bit, NaN being NaN.
func same(a, b *model.Answer) bool {
	return fmt.Sprintf("%v", flat(a)) == fmt.Sprintf("%v", flat(b))
}

// flat replaces pointers by what they point to, so that printing shows every number.
func flat(a *model.Answer) []any {
	out := []any{a.Outcome, a.Objective, a.Bound, a.Iterations}
	for _, p := range []any{a.Point, a.Multipliers, a.Farkas, a.Ray} {
		if v := reflect.ValueOf(p); !v.IsNil() {
			out = append(out, v.Elem().Interface())
		}
	}
	return out
}
