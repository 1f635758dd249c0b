package main

import (
	"bytes"
	"strings"
	"testing"
	"time"

	"towpath/capability"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/durationpb"
)

func answered() *towpathv1.Answer {
	return &towpathv1.Answer{
		Outcome: towpathv1.Outcome_OUTCOME_OPTIMAL, Objective: proto.Float64(12.5), Bound: proto.Float64(12.4999),
		Backend: "interior", BackendVersion: "1", Iterations: 9, Note: "as said",
		Values: []*towpathv1.BlockValues{
			{Name: "w", Field: towpathv1.Field_FIELD_COMPLEX, Rows: 8, Cols: 1,
				Entries: &towpathv1.Numbers{Re: []float64{1, 2, 3, 4, 5, 6, 7, 1. / 3}, Im: []float64{-1, 0, 0, 0, 0, 0, 0, 0}}},
			{Field: towpathv1.Field_FIELD_HERMITIAN, Rows: 2, Cols: 2,
				Entries: &towpathv1.Numbers{Re: []float64{11, 21, 22}, Im: []float64{0, 0.5, 0}}},
		},
		Multipliers: &towpathv1.Multipliers{Constraints: []*towpathv1.RowMultipliers{
			{Name: "balance", Field: towpathv1.Field_FIELD_COMPLEX, Rows: 1, Values: &towpathv1.Numbers{Re: []float64{3}, Im: []float64{4}}}}},
		Examination: &towpathv1.Examination{Verdict: towpathv1.Verdict_VERDICT_CHECKED, Reasons: []string{"every residual is small"},
			RelativeGap: proto.Float64(2e-9), PrimalResidual: proto.Float64(3e-10), DualResidual: proto.Float64(4e-11)},
		Route: &towpathv1.Route{Sheet: "interior/real", Backend: "interior", Exactness: towpathv1.Exactness_EXACTNESS_EXACT,
			Toll: &towpathv1.Toll{Seconds: 0.25, Bytes: 3 << 20},
			Legs: []*towpathv1.Leg{
				{Demand: &towpathv1.Demand{Kind: "map/complex/lorentz", Size: 2, Count: 7}, Bridge: "complex-lorentz/real",
					Parts: []*towpathv1.Leg{{Demand: &towpathv1.Demand{Kind: "map/real/lorentz", Size: 3, Count: 1}}}},
				{Demand: &towpathv1.Demand{Kind: "map/real/zero", Size: 1, Count: 4}},
			}},
		Timings: &towpathv1.Timings{Solved: durationpb.New(31 * time.Millisecond)},
	}
}

func TestAnswerAtAGlance(t *testing.T) {
	var out bytes.Buffer
	if err := writeAnswer(&out, answered(), "the model", show{}); err != nil {
		t.Fatal(err)
	}
	for _, fact := range []string{
		"model      the model", "outcome    optimal", "objective  12.5", "bound      12.4999", "gap        2.0e-09",
		"checked; every residual is small", "primal 3.0e-10, dual 4.0e-11", "interior 1, sheet interior/real, 9 iterations",
		"predicted 250 ms and 3.15 MB, measured 31 ms", "note       as said",
		"route  interior/real  lowered\n  map/complex/lorentz n=2 x7  over complex-lorentz/real\n" +
			"    map/real/lorentz n=3 x1   native\n  map/real/zero x4            native\n",
		"w        complex 8        1-1i  2  3  4  5  6  and 2 more (--values shows them)",
		"block 1  hermitian 2 x 2  11  21+0.5i  22", "balance  complex 1  3+4i",
	} {
		if !strings.Contains(out.String(), fact) {
			t.Errorf("no %q in\n%s", fact, out.String())
		}
	}
}

func TestAllValuesInFull(t *testing.T) {
	var out bytes.Buffer
	if err := writeAnswer(&out, answered(), "", show{values: true, multipliers: true}); err != nil {
		t.Fatal(err)
	}
	for _, fact := range []string{"0.3333333333333333", "11\n", "21+0.5i  22\n"} {
		if !strings.Contains(out.String(), fact) {
			t.Errorf("no %q in\n%s", fact, out.String())
		}
	}
	if strings.Contains(out.String(), " more ") {
		t.Errorf("something is left out of\n%s", out.String())
	}
}

func TestCertificatesAreShownAsSuch(t *testing.T) {
	a := answered()
	a.Outcome, a.Objective, a.Bound, a.Values, a.Multipliers = towpathv1.Outcome_OUTCOME_INFEASIBLE, nil, nil, nil, nil
	a.Certificate = &towpathv1.Certificate{Proof: &towpathv1.Certificate_Infeasibility{Infeasibility: answered().Multipliers}}
	var out bytes.Buffer
	if err := writeAnswer(&out, a, "", show{}); err != nil {
		t.Fatal(err)
	}
	if s := out.String(); !strings.Contains(s, "certificate of infeasibility") || !strings.Contains(s, "3+4i") || strings.Contains(s, "objective") {
		t.Errorf("got\n%s", s)
	}
	a.Certificate = &towpathv1.Certificate{Proof: &towpathv1.Certificate_Unboundedness{
		Unboundedness: &towpathv1.Direction{Blocks: answered().Values}}}
	out.Reset()
	if err := writeAnswer(&out, a, "", show{}); err != nil {
		t.Fatal(err)
	}
	if s := out.String(); !strings.Contains(s, "certificate of unboundedness") || !strings.Contains(s, "1-1i") {
		t.Errorf("got\n%s", s)
	}
}

func TestAnEmptyAnswerIsShown(t *testing.T) {
	var out bytes.Buffer
	if err := writeAnswer(&out, &towpathv1.Answer{}, "", show{}); err != nil || !strings.Contains(out.String(), "unspecified") {
		t.Errorf("%v: %s", err, out.String())
	}
}

func TestExitCodeFollowsTheVerdict(t *testing.T) {
	for verdict, want := range map[towpathv1.Verdict]int{
		towpathv1.Verdict_VERDICT_PROVED: exitAnswered, towpathv1.Verdict_VERDICT_CHECKED: exitAnswered,
		towpathv1.Verdict_VERDICT_DOUBTFUL: exitDoubtful, towpathv1.Verdict_VERDICT_REFUTED: exitDoubtful,
		towpathv1.Verdict_VERDICT_UNSPECIFIED: exitDoubtful, 99: exitDoubtful,
	} {
		a := answered()
		a.Examination.Verdict = verdict
		var out bytes.Buffer
		code := 0
		if err := present(a, "", false, show{}, streams{out: &out}); err != nil {
			code = exitCode(err)
		}
		if code != want {
			t.Errorf("%v ends with %d, want %d", verdict, code, want)
		}
	}
}

func TestTimesAndSizesAreReadable(t *testing.T) {
	for s, want := range map[float64]string{0: "0 us", 0.0012: "1.2 ms", 0.00012: "120 us", 0.000012: "12 us", 0.031: "31 ms", 0.25: "250 ms", 42: "42 s", 3700: "1h1m40s"} {
		if got := secondsText(s); got != want {
			t.Errorf("%g s: %q, want %q", s, got, want)
		}
	}
	for b, want := range map[float64]string{0: "0 kB", 1234: "1.23 kB", 2e6: "2 MB", 5.5e10: "55 GB"} {
		if got := capability.BytesText(b); got != want {
			t.Errorf("%g bytes: %q, want %q", b, got, want)
		}
	}
}
