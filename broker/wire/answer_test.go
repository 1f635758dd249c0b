package wire

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"towpath/capability"
	"towpath/model"
	"towpath/model/check"
	towpathv1 "towpath/proto/towpath/v1"
)

// answerTo makes an answer with every part, of the model's shape.
func answerTo(m *model.Model, r *rand.Rand) *model.Answer {
	point := func() *model.Point {
		p := &model.Point{}
		for k := range m.Blocks {
			b := &m.Blocks[k]
			var v []complex128
			for e := range b.Entries() {
				v = append(v, number1(r, b.RealEntry(e)))
			}
			p.Values = append(p.Values, v)
		}
		return p
	}
	multipliers := func() *model.Multipliers {
		y := &model.Multipliers{Bounds: point().Values}
		for k := range m.Blocks {
			if m.Blocks[k].Bounds == nil {
				y.Bounds[k] = nil
			}
		}
		for k := range m.Constraints {
			c := &m.Constraints[k]
			var v []complex128
			for row := range c.Map.Rows() {
				v = append(v, number1(r, c.RealRow(row)))
			}
			y.Constraints = append(y.Constraints, v)
		}
		return y
	}
	return &model.Answer{Outcome: model.Optimal, Objective: 3, Bound: math.NaN(), Point: point(), Multipliers: multipliers(), Iterations: 12, Note: "words"}
}

func TestAnswersComeBack(t *testing.T) {
	for _, n := range []int{1, 300} { // few numbers by hand, many as bytes
		r := rand.New(rand.NewPCG(5, uint64(n)))
		m := sample(r, n)
		plain, infeasible, unbounded := answerTo(m, r), answerTo(m, r), answerTo(m, r)
		infeasible.Outcome, infeasible.Farkas, infeasible.Point = model.Infeasible, infeasible.Multipliers, nil
		unbounded.Outcome, unbounded.Ray, unbounded.Multipliers = model.Unbounded, unbounded.Point, nil
		for _, a := range []*model.Answer{plain, infeasible, unbounded} {
			got, err := AnswerFromProto(m, overWire(t, AnswerToProto(m, a), &towpathv1.Answer{}))
			if err != nil {
				t.Fatal(err)
			}
			if got.Outcome != a.Outcome || got.Objective != a.Objective || !math.IsNaN(got.Bound) || got.Iterations != a.Iterations || got.Note != a.Note {
				t.Errorf("got %+v", got)
			}
			samePoint(t, "point", got.Point, a.Point)
			samePoint(t, "ray", got.Ray, a.Ray)
			sameMultipliers(t, "multipliers", got.Multipliers, a.Multipliers)
			sameMultipliers(t, "certificate", got.Farkas, a.Farkas)
		}
	}
}

func samePoint(t *testing.T, what string, got, want *model.Point) {
	t.Helper()
	if (got == nil) != (want == nil) {
		t.Fatalf("%s: got %v, want %v", what, got, want)
	}
	if want == nil {
		return
	}
	for k := range want.Values {
		sameNumbers(t, what, got.Values[k], want.Values[k])
	}
}

func sameMultipliers(t *testing.T, what string, got, want *model.Multipliers) {
	t.Helper()
	if (got == nil) != (want == nil) {
		t.Fatalf("%s: got %v, want %v", what, got, want)
	}
	if want == nil {
		return
	}
	for k := range want.Constraints {
		sameNumbers(t, what, got.Constraints[k], want.Constraints[k])
	}
	for k := range want.Bounds {
		sameNumbers(t, what+" of bounds", got.Bounds[k], want.Bounds[k])
	}
}

// An answer that does not fit its model is refused, not trusted.
func TestAnswersThatDoNotFit(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 5))
	m := sample(r, 2)
	for _, c := range []struct {
		change func(*towpathv1.Answer)
		says   string
	}{
		{func(a *towpathv1.Answer) { a.Values = a.Values[1:] }, "the answer has 3 blocks, the model 4"},
		{func(a *towpathv1.Answer) { a.Values[0].Entries = &towpathv1.Numbers{Re: []float64{1}} }, "the answer has 1 numbers for block 0 'x', which has 2"},
		{func(a *towpathv1.Answer) { a.Values[0].Entries.Im = []float64{1} }, "block 0 'x': there are 2 real and 1 imaginary parts"},
		{func(a *towpathv1.Answer) { a.Multipliers.Constraints = a.Multipliers.Constraints[1:] }, "the answer has multipliers for 7 constraints, the model has 8"},
		{func(a *towpathv1.Answer) { a.Multipliers.Constraints[0].Values = nil }, "the answer has 0 multipliers for constraint 0 'real in zero', which has 2 rows"},
		{func(a *towpathv1.Answer) { a.Multipliers.Bounds = a.Multipliers.Bounds[:2] }, "the answer has no multipliers for the bounds of block 3 'H'"},
		{func(a *towpathv1.Answer) { a.Multipliers.Bounds[0].Entries = nil }, "the answer has 0 multipliers for the bounds of block 0 'x'"},
	} {
		p := AnswerToProto(m, answerTo(m, r))
		c.change(p)
		if _, err := AnswerFromProto(m, p); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("got %v, want %s", err, c.says)
		}
	}
}

// Fields, cones, outcomes and verdicts have the same names on both sides.
func TestWordsAgree(t *testing.T) {
	agree := func(ours, theirs, prefix string) {
		t.Helper()
		if want := prefix + strings.ToUpper(strings.ReplaceAll(ours, "-", "_")); theirs != want {
			t.Errorf("'%s' is sent as %s", ours, theirs)
		}
	}
	for f := model.Real; f <= model.Hermitian; f++ {
		agree(f.String(), fieldToProto(f).String(), "FIELD_")
		if back, err := fieldFromProto(fieldToProto(f), "", ""); err != nil || back != f {
			t.Errorf("%v comes back as %v (%v)", f, back, err)
		}
	}
	for c := model.Free; c <= model.PSD; c++ {
		agree(c.String(), coneToProto(c).String(), "CONE_")
		if back, err := coneFromProto(coneToProto(c), "", ""); err != nil || back != c {
			t.Errorf("%v comes back as %v (%v)", c, back, err)
		}
	}
	for o := model.Optimal; o <= model.Stopped; o++ {
		agree(o.String(), AnswerToProto(&model.Model{}, &model.Answer{Outcome: o}).GetOutcome().String(), "OUTCOME_")
	}
	for v := check.Proved; v <= check.Refuted; v++ {
		agree(v.String(), VerdictToProto(v).String(), "VERDICT_")
	}
	for e, word := range []string{"EXACTNESS_EXACT", "EXACTNESS_INNER", "EXACTNESS_OUTER"} {
		if got := exactnessToProto(capability.Exactness(e)).String(); got != word {
			t.Errorf("exactness %d is sent as %s", e, got)
		}
	}
}

// What the examiner does not know is absent, what it knows is there.
func TestExaminationLeavesOutWhatIsNotKnown(t *testing.T) {
	r := check.Report{Verdict: check.Doubtful, Reasons: []string{"so"}, Objective: 2, Bound: math.NaN(), CertificateResidue: 0.5,
		Constraints: []check.ConstraintResiduals{{Number: 1, Name: "c", Distance: 3, SmallestEigenvalue: math.NaN(), MultiplierDistance: 4, Complementarity: math.NaN()}},
		Blocks:      []check.BlockResiduals{{Number: 2, Name: "b", Distance: 1, BoundViolation: 5, Stationarity: math.NaN(), SmallestEigenvalue: -1}}}
	p := ExaminationToProto(&r)
	if p.GetVerdict() != towpathv1.Verdict_VERDICT_DOUBTFUL || p.GetObjective() != 2 || p.Bound != nil || p.GetCertificateRadius() != 2 {
		t.Errorf("got %v", p)
	}
	c, b := p.GetConstraints()[0], p.GetBlocks()[0]
	if c.GetNumber() != 1 || c.GetDistance() != 3 || c.SmallestEigenvalue != nil || c.GetMultiplierDistance() != 4 || c.Complementarity != nil {
		t.Errorf("constraint %v", c)
	}
	if b.GetNumber() != 2 || b.GetBoundViolation() != 5 || b.Stationarity != nil || b.GetSmallestEigenvalue() != -1 {
		t.Errorf("block %v", b)
	}
}
