package main

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"towpath/broker/wire"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/encoding/protojson"
	"google.golang.org/protobuf/proto"
)

// embedded returns a broker inside this process.
func embedded(t *testing.T) *broker {
	t.Helper()
	b, err := connect("")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(b.close)
	return b
}

// answerIn parses what --json wrote: the answer and nothing else.
func answerIn(t *testing.T, stdout string) *towpathv1.Answer {
	t.Helper()
	a := new(towpathv1.Answer)
	if err := protojson.Unmarshal([]byte(stdout), a); err != nil {
		t.Fatalf("standard output is not an answer: %v\n%s", err, stdout)
	}
	return a
}

// examples are the files of the examples folder with what is known of them.
var examples = []struct {
	file      string
	outcome   towpathv1.Outcome
	objective float64
	why       string
}{
	{"two-phases.json", towpathv1.Outcome_OUTCOME_OPTIMAL, 0.5 + 0.25*math.Sqrt2,
		"(1 + sqrt(1 - |<a|b>|^2))/2 with |<a|b>|^2 = 1/2: C. Helstrom, Quantum Detection and Estimation Theory, 1976, from memory"},
	{"feeder.json", towpathv1.Outcome_OUTCOME_OPTIMAL, 0.5 + 0.03*0.29/((0.946+math.Sqrt(0.946*0.946-4*0.0045*0.29))/2),
		"the voltage equation of one line, u^2 + (2(rp + xq) - 1) u + |z|^2 |s|^2 = 0, solved for u; losses r |s|^2/u; common practice, no source"},
	{"beam.json", towpathv1.Outcome_OUTCOME_OPTIMAL, 1. / 3,
		"three nodes determine the response, a polynomial of degree two; the Lagrange weights i, -i, 1 at the wanted bearing have moduli that add up to 3"},
	{"too-much-gain.json", towpathv1.Outcome_OUTCOME_INFEASIBLE, math.NaN(),
		"weights of norm 1 add up to sqrt(3) at most (Cauchy-Schwarz), 2 is asked for"},
	{"fuel-boats.json", towpathv1.Outcome_OUTCOME_OPTIMAL, 9.5,
		"the cheaper boat makes all its 2.5 trips, the other one the 1.5 that are missing"},
	{"mail-boats.mps", towpathv1.Outcome_OUTCOME_OPTIMAL, 9.5, "the same, in other words"},
	{"two-masts.dat-s", towpathv1.Outcome_OUTCOME_OPTIMAL, 2, "two positive numbers whose product is at least one add up to two at least"},
}

func TestEveryExampleFileIsKnown(t *testing.T) {
	files, err := filepath.Glob("examples/*")
	if err != nil || len(files) != len(examples) {
		t.Errorf("%d files in examples, %d known: %v", len(files), len(examples), err)
	}
}

func TestExamplesAsJSON(t *testing.T) {
	for _, e := range examples {
		for _, sheet := range []string{"", "interior/complex", "interior/real"} {
			args := []string{"solve", "--json", "--need-multipliers", filepath.Join("examples", e.file)}
			if sheet != "" {
				args = append(args, "--sheet", sheet)
			}
			code, out, stderr := towpath(t, "", args...)
			if code != exitAnswered || stderr != "" {
				t.Errorf("%s under %q: code %d, %s", e.file, sheet, code, stderr)
				continue
			}
			a := answerIn(t, out)
			if a.GetOutcome() != e.outcome || a.GetExamination().GetVerdict() != towpathv1.Verdict_VERDICT_CHECKED {
				t.Errorf("%s under %q: %v, %v", e.file, sheet, a.GetOutcome(), a.GetExamination())
			}
			if sheet != "" && a.GetRoute().GetSheet() != sheet {
				t.Errorf("%s: asked for %s, went to %s", e.file, sheet, a.GetRoute().GetSheet())
			}
			if !math.IsNaN(e.objective) && math.Abs(a.GetObjective()-e.objective) > 1e-6 {
				t.Errorf("%s under %q: objective %.10g, want %.10g: %s", e.file, sheet, a.GetObjective(), e.objective, e.why)
			}
			if e.outcome == towpathv1.Outcome_OUTCOME_INFEASIBLE && a.GetCertificate().GetInfeasibility() == nil {
				t.Errorf("%s under %q: infeasible without a certificate", e.file, sheet)
			}
		}
	}
}

func TestExampleForPeople(t *testing.T) {
	code, out, stderr := towpath(t, "", "solve", "examples/two-phases.json")
	if code != exitAnswered {
		t.Fatalf("code %d: %s", code, stderr)
	}
	for _, fact := range []string{"Does the pulse have phase 0", "optimal", "0.85355339", "checked", "route  ", "predicted ", "measured ",
		"says zero", "hermitian 2 x 2", "residuals  primal "} {
		if !strings.Contains(out, fact) {
			t.Errorf("no %q in\n%s", fact, out)
		}
	}
	code, out, stderr = towpath(t, "", "solve", "examples/too-much-gain.json")
	if code != exitAnswered || !strings.Contains(out, "infeasible") || !strings.Contains(out, "certificate of infeasibility") {
		t.Errorf("code %d, %s\n%s", code, stderr, out)
	}
}

func TestStandardInputAndBinary(t *testing.T) {
	text, err := os.ReadFile("examples/fuel-boats.json")
	if err != nil {
		t.Fatal(err)
	}
	code, out, stderr := towpath(t, string(text), "solve", "-", "--json")
	if code != exitAnswered {
		t.Fatalf("standard input: code %d: %s", code, stderr)
	}
	if a := answerIn(t, out); math.Abs(a.GetObjective()-9.5) > 1e-6 {
		t.Errorf("objective %v", a.GetObjective())
	}
	m, err := parseJSON(text)
	if err != nil {
		t.Fatal(err)
	}
	data, err := proto.Marshal(m)
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"boats.pb", "boats.binpb", "boats"} {
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, data, 0o600); err != nil {
			t.Fatal(err)
		}
		args := []string{"solve", "--json", path}
		if name == "boats" {
			args = append(args, "--format", "binary")
		}
		code, out, stderr := towpath(t, "", args...)
		if code != exitAnswered {
			t.Fatalf("%s: code %d: %s", name, code, stderr)
		}
		if a := answerIn(t, out); math.Abs(a.GetObjective()-9.5) > 1e-6 {
			t.Errorf("%s: objective %v", name, a.GetObjective())
		}
	}
}

// TestFormatByName reads a file whose name does not tell its format.
func TestFormatByName(t *testing.T) {
	for name, format := range map[string]string{"mail-boats.mps": "mps", "two-masts.dat-s": "sdpa", "beam.json": "json"} {
		text, err := os.ReadFile(filepath.Join("examples", name))
		if err != nil {
			t.Fatal(err)
		}
		code, out, stderr := towpath(t, string(text), "routes", "--format", format, "-")
		if code != exitAnswered || !strings.Contains(out, "interior/complex") {
			t.Errorf("%s: code %d: %s%s", name, code, out, stderr)
		}
	}
}

func TestUnreadableModelsAreExplained(t *testing.T) {
	for _, c := range []struct {
		name, text string
		says       []string
	}{
		{"a.json", `{"blocks": [{"nome": "x"}]}`, []string{"a.json", "nome"}},
		{"a.json", `{"blocks": `, []string{"a.json", "read as json"}},
		{"a.pb", "\xff\xff", []string{"a.pb", "read as binary"}},
		{"a.mps", "ROWS\n Q  X\n", []string{"a.mps, read as mps", "line 2: row kind Q is unknown"}},
		{"a.dat-s", "2\n1\n", []string{"a.dat-s, read as sdpa", "it ends after 0 of 1 block sizes"}},
		{"a.mps", "ROWS\n N c\nCOLUMNS\n x c 1\nBOUNDS\n LO x 3\n UP x 2\nENDATA\n", []string{"block 0 'x'", "lower limit 3"}},
		{"a.txt", "hello", []string{"a.txt", "--format"}},
		{"a.json", `{}`, []string{"block"}},
		{"a.json", `{"blocks":[{"name":"x","field":"FIELD_REAL","rows":1}],"constraints":[{"name":"bound on x","field":"FIELD_REAL","rows":1,
			"cone":"CONE_NONNEG","terms":[{"block":"y","re":1}]}]}`, []string{"bound on x", "y"}},
	} {
		path := filepath.Join(t.TempDir(), c.name)
		if err := os.WriteFile(path, []byte(c.text), 0o600); err != nil {
			t.Fatal(err)
		}
		code, out, stderr := towpath(t, "", "solve", path)
		if code != exitUsage || out != "" || strings.Count(stderr, "\n") != 1 {
			t.Errorf("%s %q: code %d, output %q, %q", c.name, c.text, code, out, stderr)
		}
		for _, word := range c.says {
			if !strings.Contains(stderr, word) {
				t.Errorf("%s %q: no %q in %q", c.name, c.text, word, stderr)
			}
		}
	}
}

func TestNoRouteSaysWhy(t *testing.T) {
	code, _, stderr := towpath(t, "", "solve", "examples/two-phases.json", "--sheet", "nobody/has-this")
	if code != exitUsage && code != exitUnanswered || !strings.Contains(stderr, "nobody/has-this") {
		t.Errorf("code %d, %q", code, stderr)
	}
}

func TestRoutesShowEverySheet(t *testing.T) {
	code, out, stderr := towpath(t, "", "routes", "examples/two-phases.json")
	if code != exitAnswered {
		t.Fatalf("code %d: %s", code, stderr)
	}
	for _, fact := range []string{"block/hermitian/psd", "interior/complex", "interior/real", "hermitian-psd"} {
		if !strings.Contains(out, fact) {
			t.Errorf("no %q in\n%s", fact, out)
		}
	}
	code, out, _ = towpath(t, "", "routes", "--json", "examples/two-phases.json")
	plan := new(towpathv1.PlanRoutesResponse)
	if err := protojson.Unmarshal([]byte(out), plan); code != exitAnswered || err != nil {
		t.Fatalf("code %d, %v", code, err)
	}
	chosen := 0
	for _, p := range plan.GetProposals() {
		if p.GetChosen() {
			chosen++
		}
	}
	if chosen != 1 || len(plan.GetProposals()) < 2 {
		t.Errorf("%d of %d proposals chosen", chosen, len(plan.GetProposals()))
	}
}

func TestBackendsAreListed(t *testing.T) {
	code, out, stderr := towpath(t, "", "backends")
	if code != exitAnswered {
		t.Fatalf("code %d: %s", code, stderr)
	}
	for _, fact := range []string{"interior", "interior/complex", "block/hermitian/psd", "csdp", "glpk"} {
		if !strings.Contains(out, fact) {
			t.Errorf("no %q in\n%s", fact, out)
		}
	}
	code, out, _ = towpath(t, "", "backends", "--json")
	if err := protojson.Unmarshal([]byte(out), new(towpathv1.ListBackendsResponse)); code != exitAnswered || err != nil {
		t.Errorf("code %d, %v", code, err)
	}
}

func TestProgressGoesToStandardError(t *testing.T) {
	code, out, stderr := towpath(t, "", "solve", "--progress", "--json", "--sheet", "interior/complex", "examples/beam.json")
	if code != exitAnswered {
		t.Fatalf("code %d: %s", code, stderr)
	}
	answerIn(t, out)
	if !strings.Contains(stderr, "iteration ") || !strings.Contains(stderr, "answered: optimal, checked") {
		t.Errorf("got %q", stderr)
	}
}

// TestLargeModelsAreUploaded asks for the routes of a model that no single message can hold, once with arrays and once
// with as many readable terms.
func TestLargeModelsAreUploaded(t *testing.T) {
	const n = 300_000
	m := &model.Model{Name: "sum", Blocks: []model.Block{{Name: "x", Field: model.Complex, Rows: n, Cols: 1}}}
	row := model.Matrix{Start: []int{0, n}, Col: make([]uint32, n), Z: make([]complex128, n)}
	for k := range n {
		row.Col[k], row.Z[k] = uint32(k), complex(1, float64(k))
	}
	m.Constraints = []model.Constraint{{Name: "sum", Map: model.Map{Field: model.Complex, Lin: row}, Cone: model.Cone{Kind: model.Zero}}}
	arrays := wire.ModelToProto(m)
	terms := proto.Clone(arrays).(*towpathv1.Model)
	terms.Constraints[0].Coefficients = nil
	for k := range n {
		terms.Constraints[0].Terms = append(terms.Constraints[0].Terms,
			&towpathv1.Term{Of: &towpathv1.Term_BlockNumber{}, Entry: []uint64{uint64(k)}, Re: 1, Im: float64(k)})
	}
	b := embedded(t)
	for name, sent := range map[string]*towpathv1.Model{"arrays": arrays, "terms": terms} {
		if size := proto.Size(sent); size <= 4<<20 {
			t.Fatalf("%s: only %d bytes", name, size)
		}
		plan, err := b.plan(t.Context(), sent, nil)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		found := false
		for _, d := range plan.GetDemands() {
			found = found || d.GetKind() == "map/complex/zero" && d.GetNonzeros() == n
		}
		if !found {
			t.Errorf("%s: the broker saw %v", name, plan.GetDemands())
		}
	}
}

func TestDemo(t *testing.T) {
	code, out, stderr := towpath(t, "", "demo")
	if code != exitAnswered {
		t.Errorf("code %d: %s", code, stderr)
	}
	for _, fact := range []string{"grid-cones", "grid-matrix", "pulses", "sidelobes", "ferries", "native", "bridges", "Dolph 1946",
		"in the right order", "Wind ridge", "advisory"} {
		if !strings.Contains(out, fact) {
			t.Errorf("no %q in\n%s", fact, out)
		}
	}
	if strings.Contains(out, "NaN") || strings.Contains(out, "doubtful") || strings.Contains(out, "refuted") {
		t.Errorf("something is missing or wrong in\n%s", out)
	}
}
