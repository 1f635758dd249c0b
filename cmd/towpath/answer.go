package main

import (
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"towpath/broker/wire"
	"towpath/capability"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/types/known/durationpb"
)

// show says how much of an answer people see.
type show struct {
	values, multipliers bool // all of them, instead of the first few
}

// writeAnswer shows an answer at a glance: what came out, whether it may be trusted, which way it took, what it cost,
// and the first numbers.
func writeAnswer(w io.Writer, a *towpathv1.Answer, name string, s show) error {
	e := a.GetExamination()
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	line := func(label, format string, v ...any) { fmt.Fprintf(t, "%s\t%s\n", label, fmt.Sprintf(format, v...)) }
	if name != "" {
		line("model", "%s", name)
	}
	line("outcome", "%s", outcomeWord(a.GetOutcome()))
	if a.Objective != nil {
		line("objective", "%s", valueText(a.Objective))
	}
	if a.Bound != nil {
		line("bound", "%s", valueText(a.Bound))
	}
	if e != nil && e.RelativeGap != nil {
		line("gap", "%s relative, recomputed", residualText(e.RelativeGap))
	}
	line("verdict", "%s", strings.Join(append([]string{verdictWord(e.GetVerdict())}, e.GetReasons()...), "; "))
	line("residuals", "%s", residualsText(e))
	line("back end", "%s %s, sheet %s, %d iterations", a.GetBackend(), a.GetBackendVersion(), a.GetRoute().GetSheet(), a.GetIterations())
	line("toll", "predicted %s and %s, measured %s", secondsText(a.GetRoute().GetToll().GetSeconds()),
		capability.BytesText(a.GetRoute().GetToll().GetBytes()), durationText(a.GetTimings().GetSolved()))
	if tm := a.GetTimings(); tm != nil {
		line("time", "waited %s, planned %s, lowered %s, solved %s, lifted %s, examined %s",
			durationText(tm.GetWaited()), durationText(tm.GetPlanned()), durationText(tm.GetLowered()),
			durationText(tm.GetSolved()), durationText(tm.GetLifted()), durationText(tm.GetExamined()))
	}
	if a.GetNote() != "" {
		line("note", "%s", a.GetNote())
	}
	t.Flush()
	if a.GetRoute() != nil {
		fmt.Fprintln(w)
		writeRoute(w, a.GetRoute())
	}
	return writeNumbers(w, a, s)
}

func residualsText(e *towpathv1.Examination) string {
	var parts []string
	add := func(name string, x *float64) {
		if x != nil {
			parts = append(parts, name+" "+residualText(x))
		}
	}
	if e != nil {
		add("primal", e.PrimalResidual)
		add("dual", e.DualResidual)
		add("complementarity", e.Complementarity)
		add("certificate", e.CertificateResidual)
		add("certificate rules out points of norm up to", e.CertificateRadius)
	}
	if len(parts) == 0 {
		return "none: there is nothing to measure"
	}
	return strings.Join(parts, ", ")
}

func durationText(d *durationpb.Duration) string {
	if d == nil {
		return "-"
	}
	return secondsText(d.AsDuration().Seconds())
}

// Few numbers fit a glance; the rest is counted.
const (
	shownEntries     = 6
	shownConstraints = 8
	shownBlocks      = 12
)

func writeNumbers(w io.Writer, a *towpathv1.Answer, s show) error {
	if len(a.GetValues()) > 0 {
		fmt.Fprint(w, "\nvalues\n")
		if err := writeBlocks(w, a.GetValues(), s.values, "--values"); err != nil {
			return err
		}
	}
	if m := a.GetMultipliers(); m != nil {
		fmt.Fprint(w, "\nmultipliers\n")
		if err := writeMultipliers(w, m, s.multipliers, "--multipliers"); err != nil {
			return err
		}
	}
	switch c := a.GetCertificate(); {
	case c.GetInfeasibility() != nil:
		fmt.Fprint(w, "\ncertificate of infeasibility: these multipliers make a contradiction of the constraints\n")
		return writeMultipliers(w, c.GetInfeasibility(), s.multipliers, "--multipliers")
	case c.GetUnboundedness() != nil:
		fmt.Fprint(w, "\ncertificate of unboundedness: the objective improves without end in this direction\n")
		return writeBlocks(w, c.GetUnboundedness().GetBlocks(), s.values, "--values")
	}
	return nil
}

func writeMultipliers(w io.Writer, m *towpathv1.Multipliers, all bool, option string) error {
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	for k, c := range m.GetConstraints() {
		if !all && k == shownConstraints {
			fmt.Fprintf(t, "  and %d more constraints (%s shows them)\n", len(m.GetConstraints())-k, option)
			break
		}
		if err := writeList(t, c.GetName(), "constraint", k, c.GetField(), c.GetRows(), 1, c.GetValues(), all, option); err != nil {
			return err
		}
	}
	if len(m.GetBounds()) > 0 {
		fmt.Fprintln(t, "  of bounds")
		for k, b := range m.GetBounds() {
			if !all && k == shownConstraints {
				fmt.Fprintf(t, "  and %d more blocks (%s shows them)\n", len(m.GetBounds())-k, option)
				break
			}
			if err := writeList(t, b.GetName(), "block", k, b.GetField(), b.GetRows(), b.GetCols(), b.GetEntries(), all, option); err != nil {
				return err
			}
		}
	}
	return t.Flush()
}

func writeBlocks(w io.Writer, blocks []*towpathv1.BlockValues, all bool, option string) error {
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	for k, b := range blocks {
		if !all && k == shownBlocks {
			fmt.Fprintf(t, "  and %d more blocks (%s shows them)\n", len(blocks)-k, option)
			break
		}
		if err := writeList(t, b.GetName(), "block", k, b.GetField(), b.GetRows(), b.GetCols(), b.GetEntries(), all, option); err != nil {
			return err
		}
	}
	return t.Flush()
}

// writeList shows the numbers of one block or constraint on one line, or, where all are wanted, as many lines as a
// matrix has rows. Of symmetric and Hermitian matrices the lower triangle is shown, as it is stored.
func writeList(w io.Writer, name, what string, k int, field towpathv1.Field, rows, cols uint64, n *towpathv1.Numbers, all bool, option string) error {
	z, err := wire.NumbersFromProto(n)
	if err != nil {
		return fmt.Errorf("%s %d of the answer: %w", what, k, err)
	}
	if name == "" {
		name = fmt.Sprintf("%s %d", what, k)
	}
	matrix := field == towpathv1.Field_FIELD_SYMMETRIC || field == towpathv1.Field_FIELD_HERMITIAN
	if matrix {
		cols = rows
	}
	shape := fmt.Sprintf("%s %d", fieldWord(field), rows)
	if matrix || cols > 1 {
		shape += fmt.Sprintf(" x %d", cols)
	}
	if all && (matrix || cols > 1) {
		fmt.Fprintf(w, "  %s\t%s\n", name, shape)
		for i := range rows {
			fmt.Fprintf(w, "\t\t%s\n", strings.Join(matrixRow(z, matrix, i, rows, cols), "\t"))
		}
		return nil
	}
	shown, digits := z, fullDigits
	if !all {
		shown, digits = z[:min(len(z), shownEntries)], shownDigits
	}
	texts := make([]string, len(shown))
	for i, x := range shown {
		texts[i] = numberText(x, digits)
	}
	if rest := len(z) - len(shown); rest > 0 {
		texts = append(texts, fmt.Sprintf("and %d more (%s shows them)", rest, option))
	}
	fmt.Fprintf(w, "  %s\t%s\t%s\n", name, shape, strings.Join(texts, "  "))
	return nil
}

// matrixRow returns the texts of row i: up to the diagonal for packed lower triangles (by columns), else all columns.
func matrixRow(z []complex128, packed bool, i, rows, cols uint64) []string {
	last := cols
	if packed {
		last = i + 1
	}
	var texts []string
	for j := range last {
		k := j*rows + i
		if packed {
			k -= j * (j + 1) / 2
		}
		if k < uint64(len(z)) {
			texts = append(texts, numberText(z[k], fullDigits))
		}
	}
	return texts
}
