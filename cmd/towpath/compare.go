package main

import (
	"fmt"
	"io"
	"math"
	"math/cmplx"
	"text/tabwriter"

	"towpath/broker/wire"
	"towpath/model/archipelago"
	towpathv1 "towpath/proto/towpath/v1"
)

// agreement is how closely two routes to one optimum must meet, relative to the optimum: back ends stop at relative
// gaps of 1e-7 to 1e-8, and what is left of the gap may show on either side.
const agreement = 1e-5

// multiplierAgreement is wider: the distance of a multiplier to the optimal one goes with the root of the gap where
// the model is not strictly curved.
const multiplierAgreement = 1e-3

// writeComparison shows all answers in one table and reports whether all hold and agree.
func writeComparison(w io.Writer, cases []archipelago.Case, journeys [][]journey) bool {
	agreed := true
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "model\tsheet\troute\toutcome\tobjective\tbound\tverdict\tdifference\tof multipliers\tpredicted\tmeasured")
	for i, c := range cases {
		native := journeys[i][0].answer
		for _, j := range journeys[i] {
			if j.err != nil {
				agreed = false
				fmt.Fprintf(t, "%s\t%s\tnone: %s\n", c.ID, j.trial.label, explain(j.err))
				continue
			}
			a := j.answer
			agreed = agreed && holds(a)
			difference, multipliers := "-", "-"
			if native != nil && a != native {
				d, m := objectiveDifference(a.GetObjective(), native.GetObjective()), multiplierDifference(a, native)
				difference, multipliers = fmt.Sprintf("%.1e", d), fmt.Sprintf("%.1e", m)
				agreed = agreed && d <= agreement
			}
			fmt.Fprintf(t, "%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\n", c.ID, a.GetRoute().GetSheet(), routeText(a.GetRoute()),
				outcomeWord(a.GetOutcome()), valueText(a.Objective), valueText(a.Bound), verdictWord(a.GetExamination().GetVerdict()),
				difference, multipliers, secondsText(a.GetRoute().GetToll().GetSeconds()), durationText(a.GetTimings().GetSolved()))
		}
	}
	t.Flush()
	fmt.Fprintln(w, "Differences are to the first row of the model, relative.")
	return agreed
}

// holds reports whether an answer is an optimum that passed its examination.
func holds(a *towpathv1.Answer) bool {
	v := a.GetExamination().GetVerdict()
	return a.GetOutcome() == towpathv1.Outcome_OUTCOME_OPTIMAL &&
		(v == towpathv1.Verdict_VERDICT_CHECKED || v == towpathv1.Verdict_VERDICT_PROVED)
}

func routeText(r *towpathv1.Route) string {
	if r.GetNative() {
		return "native"
	}
	names := bridgeNames(r)
	if len(names) == 1 {
		return "1 bridge"
	}
	return fmt.Sprintf("%d bridges", len(names))
}

func objectiveDifference(a, b float64) float64 { return math.Abs(a-b) / (1 + math.Abs(b)) }

// multiplierDifference is the largest difference between two answers' multipliers, relative to the largest
// multiplier; NaN where they cannot be compared.
func multiplierDifference(a, b *towpathv1.Answer) float64 {
	worst, size := 0.0, 1.0
	compare := func(x, y *towpathv1.Numbers) {
		p, err := wire.NumbersFromProto(x)
		q, err2 := wire.NumbersFromProto(y)
		if err != nil || err2 != nil || len(p) != len(q) {
			worst = math.NaN()
			return
		}
		for k := range p {
			worst = math.Max(worst, cmplx.Abs(p[k]-q[k])) // math.Max keeps NaN
			size = max(size, cmplx.Abs(q[k]))
		}
	}
	ma, mb := a.GetMultipliers(), b.GetMultipliers()
	if ma == nil || mb == nil || len(ma.GetConstraints()) != len(mb.GetConstraints()) || len(ma.GetBounds()) != len(mb.GetBounds()) {
		return math.NaN()
	}
	for k, c := range ma.GetConstraints() {
		compare(c.GetValues(), mb.GetConstraints()[k].GetValues())
	}
	for k, b := range ma.GetBounds() {
		compare(b.GetEntries(), mb.GetBounds()[k].GetEntries())
	}
	return worst / size
}

// writeKnown holds all answers of the cases with a closed form against it and reports whether they meet.
func writeKnown(w io.Writer, cases []archipelago.Case, journeys [][]journey) bool {
	agreed := true
	fmt.Fprint(w, "\nClosed forms\n")
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "model\tknown optimum\tworst difference\tof multipliers\tsource")
	for i, c := range cases {
		if c.Known == nil {
			continue
		}
		objective, multipliers := 0.0, 0.0
		for _, j := range journeys[i] {
			if j.answer == nil {
				objective = math.NaN()
				continue
			}
			objective = math.Max(objective, objectiveDifference(j.answer.GetObjective(), c.Known.Objective))
			multipliers = math.Max(multipliers, knownDifference(j.answer, c.Known))
		}
		agreed = agreed && objective <= agreement && multipliers <= multiplierAgreement
		fmt.Fprintf(t, "%s\t%.10g\t%.1e\t%.1e\t%s\n", c.ID, c.Known.Objective, objective, multipliers, c.Known.Source)
	}
	t.Flush()
	return agreed
}

// knownDifference is the largest difference of an answer's multipliers from known ones, relative to the largest known.
func knownDifference(a *towpathv1.Answer, known *archipelago.Known) float64 {
	worst, size := 0.0, 1e-300
	for k, expected := range known.Multipliers {
		got := []complex128(nil)
		if rows := a.GetMultipliers().GetConstraints(); k < len(rows) {
			got, _ = wire.NumbersFromProto(rows[k].GetValues())
		}
		if len(got) != len(expected) {
			return math.NaN()
		}
		for r := range expected {
			worst = math.Max(worst, cmplx.Abs(got[r]-expected[r]))
			size = max(size, cmplx.Abs(expected[r]))
		}
	}
	return worst / size
}

// writeGridBounds holds the two bounds on the grid's cost against each other.
func writeGridBounds(w io.Writer, cases []archipelago.Case, journeys [][]journey) bool {
	objective := func(id string) float64 {
		for i, c := range cases {
			if c.ID == id && journeys[i][0].answer != nil {
				return journeys[i][0].answer.GetObjective()
			}
		}
		return math.NaN()
	}
	cones, matrix := objective("grid-cones"), objective("grid-matrix")
	ordered, remark := cones <= matrix*(1+agreement), "in the right order"
	if !ordered {
		remark = "which is the wrong order"
	}
	fmt.Fprintf(w, "\nCost of the grid: at least %.2f per hour by second-order cones, at least %.2f by the voltage matrix, %s.\n",
		cones, matrix, remark)
	return ordered
}
