package main

import (
	"compress/gzip"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// known is one record of published.json of the collections.
type known struct {
	Value     *float64 `json:"value"`
	Status    string   `json:"status"`
	Tolerance float64  `json:"tolerance"`
}

// collection reads published.json of a folder of the outside data.
func collection(t *testing.T, folder string) (dir string, all map[string]known) {
	t.Helper()
	dir = os.Getenv("TOWPATH_CHECK_DATA")
	if dir == "" {
		t.Skip("TOWPATH_CHECK_DATA is not set: published " + folder + " values are not tested")
	}
	dir = filepath.Join(dir, folder)
	text, err := os.ReadFile(filepath.Join(dir, "published.json"))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, &all); err != nil {
		t.Fatal(err)
	}
	return dir, all
}

// SDPLIB (B. Borchers, SDPLIB 1.2, a library of semidefinite programming test problems, 1999) states min c x over the
// matrix inequality. Its words for the infeasible ones name the sides of the pair: of infp1 that inequality, of infd1
// its dual, so that the inequality is unbounded.
func TestPublishedSemidefinitePrograms(t *testing.T) {
	if testing.Short() {
		t.Skip("takes long")
	}
	dir, all := collection(t, "sdplib")
	b := embedded(t)
	for name, want := range all {
		t.Run(name, func(t *testing.T) {
			m, err := (&fileFlags{}).read([]string{filepath.Join(dir, name+".dat-s")}, nil)
			if err != nil {
				t.Fatal(err)
			}
			a := programAnswer(t, b, m, "interior/complex")
			verdict := verdictWord(a.GetExamination().GetVerdict())
			t.Logf("%s %.10g in %s, %d iterations, %s", outcomeWord(a.GetOutcome()), a.GetObjective(), durationText(a.GetTimings().GetSolved()), a.GetIterations(), verdict)
			switch want.Status {
			case "primal infeasible":
				if a.GetOutcome() != towpathv1.Outcome_OUTCOME_INFEASIBLE || verdict != "checked" {
					t.Errorf("want infeasible, checked")
				}
			case "dual infeasible":
				if a.GetOutcome() != towpathv1.Outcome_OUTCOME_UNBOUNDED || verdict != "checked" {
					t.Errorf("want unbounded, checked")
				}
			case "optimal":
				if off := math.Abs(a.GetObjective()-*want.Value) / (1 + math.Abs(*want.Value)); !(off <= 3*want.Tolerance) {
					t.Errorf("objective %.10g, published %.10g", a.GetObjective(), *want.Value)
				}
				if verdict != "checked" && name != "hinf1" { // its multipliers are too large for double precision to be sure
					t.Errorf("%s: %v", verdict, a.GetExamination().GetReasons()[:1])
				}
			}
		})
	}
}

// linearProgram is one file of the collection of linear programs: minimize c x, A_ub x <= b_ub, A_eq x = b_eq, bounds.
type linearProgram struct {
	Cost       []float64     `json:"c"`
	Bounds     [][2]*float64 `json:"bounds"`
	AtMost     [][3]float64  `json:"A_ub"` // row, column, value
	AtMostSide []float64     `json:"b_ub"`
	Equal      [][3]float64  `json:"A_eq"`
	EqualSide  []float64     `json:"b_eq"`
}

// mps writes the program in free MPS, so that the reader is tried on it, too.
func (p *linearProgram) mps() string {
	var w strings.Builder
	w.WriteString("ROWS\n N c\n")
	columns := make([]strings.Builder, len(p.Cost))
	rows := func(kind string, sides []float64, entries [][3]float64) {
		for r := range sides {
			fmt.Fprintf(&w, " %s %s%d\n", kind, kind, r)
		}
		for _, e := range entries {
			fmt.Fprintf(&columns[int(e[1])], " x%d %s%d %.17g\n", int(e[1]), kind, int(e[0]), e[2])
		}
	}
	rows("L", p.AtMostSide, p.AtMost)
	rows("E", p.EqualSide, p.Equal)
	w.WriteString("COLUMNS\n")
	for j, c := range p.Cost {
		fmt.Fprintf(&w, " x%d c %.17g\n%s", j, c, columns[j].String())
	}
	w.WriteString("RHS\n")
	for r, b := range p.AtMostSide {
		fmt.Fprintf(&w, " L%d %.17g\n", r, b)
	}
	for r, b := range p.EqualSide {
		fmt.Fprintf(&w, " E%d %.17g\n", r, b)
	}
	w.WriteString("BOUNDS\n")
	for j, b := range p.Bounds {
		if b[0] == nil {
			fmt.Fprintf(&w, " MI x%d\n", j)
		} else {
			fmt.Fprintf(&w, " LO x%d %.17g\n", j, *b[0])
		}
		if b[1] != nil {
			fmt.Fprintf(&w, " UP x%d %.17g\n", j, *b[1])
		}
	}
	w.WriteString("ENDATA\n")
	return w.String()
}

// Netlib's linear programs (D. M. Gay, Electronic mail distribution of linear programming test problems, 1985), feasible
// and infeasible, through the MPS reader to every sheet that solves linear programs at this size.
func TestPublishedLinearPrograms(t *testing.T) {
	if testing.Short() {
		t.Skip("takes long")
	}
	dir, all := collection(t, "lp")
	b := embedded(t)
	sheets := []string{"interior/real"}
	if here(t, "glpk") {
		sheets = append(sheets, "glpk/lp")
	} else {
		t.Log("glpsol is absent (Debian package glpk-utils): its routes are not tested")
	}
	for name, want := range all {
		f, err := os.Open(filepath.Join(dir, name+".json.gz"))
		if err != nil {
			t.Fatal(err)
		}
		z, err := gzip.NewReader(f)
		if err != nil {
			t.Fatal(err)
		}
		var p linearProgram
		if err := json.NewDecoder(z).Decode(&p); err != nil {
			t.Fatal(err)
		}
		f.Close()
		m, err := (&fileFlags{format: "mps"}).read([]string{"-"}, strings.NewReader(p.mps()))
		if err != nil {
			t.Fatal(err)
		}
		for _, sheet := range sheets {
			t.Run(name+"/"+sheet, func(t *testing.T) {
				a := programAnswer(t, b, proto.CloneOf(m), sheet)
				verdict := verdictWord(a.GetExamination().GetVerdict())
				t.Logf("%s %.10g in %s, %d iterations, %s", outcomeWord(a.GetOutcome()), a.GetObjective(), durationText(a.GetTimings().GetSolved()), a.GetIterations(), verdict)
				if name == "infeas_cplex2" && verdict == "doubtful" {
					return // infeasible by a hair: at these tolerances doubt is honest
				}
				if verdict != "checked" {
					t.Errorf("%s %s: %v", outcomeWord(a.GetOutcome()), verdict, a.GetExamination().GetReasons()[:1])
				}
				if want.Status != "optimal" {
					if a.GetOutcome() != towpathv1.Outcome_OUTCOME_INFEASIBLE {
						t.Errorf("%s, published as %s", outcomeWord(a.GetOutcome()), want.Status)
					}
				} else if off := math.Abs(a.GetObjective()-*want.Value) / (1 + math.Abs(*want.Value)); !(off <= 1e-6) {
					t.Errorf("objective %.10g, published %.10g", a.GetObjective(), *want.Value)
				}
			})
		}
	}
}

// programAnswer solves on one sheet.
func programAnswer(t *testing.T, b *broker, m *towpathv1.Model, sheet string) *towpathv1.Answer {
	t.Helper()
	a, err := b.solve(t.Context(), m, &towpathv1.JobOptions{Sheet: sheet, NeedMultipliers: true, NeedCertificates: true}, nil)
	if err != nil {
		t.Fatal(explain(err))
	}
	return a
}

// here reports whether a back end is on this machine.
func here(t *testing.T, backend string) bool {
	t.Helper()
	code, out, stderr := towpath(t, "", "backends")
	if code != exitAnswered {
		t.Fatal(stderr)
	}
	return strings.Contains(out, backend+"/")
}
