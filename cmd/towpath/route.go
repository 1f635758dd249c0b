package main

import (
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	towpathv1 "towpath/proto/towpath/v1"
)

// shownLegs is how many demands a route shows beside an answer; towpath routes shows all.
const shownLegs = 24

// writeRoute shows the route of an answer as a tree, in the form of the planner's own printer: a line per demand, below it
// what one of it becomes.
func writeRoute(w io.Writer, r *towpathv1.Route) {
	how := "lowered"
	if r.GetNative() {
		how = "native"
	}
	fmt.Fprintf(w, "route  %s  %s", r.GetSheet(), how)
	if r.GetExactness() != towpathv1.Exactness_EXACTNESS_EXACT {
		fmt.Fprintf(w, "  %s", exactnessWord(r.GetExactness()))
	}
	fmt.Fprintln(w)
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	for k, l := range r.GetLegs() {
		if k == shownLegs {
			fmt.Fprintf(t, "  and %d more demands\n", len(r.GetLegs())-k)
			break
		}
		writeLeg(t, l, 1)
	}
	t.Flush()
}

func writeLeg(w io.Writer, l *towpathv1.Leg, depth int) {
	way := "native"
	if l.GetBridge() != "" {
		way = "over " + l.GetBridge()
	}
	fmt.Fprintf(w, "%s%s\t%s\n", strings.Repeat("  ", depth), demandText(l.GetDemand()), way)
	for _, p := range l.GetParts() {
		writeLeg(w, p, depth+1)
	}
}

// demandText writes a demand as the planner does: "map/complex/lorentz n=2 x12".
func demandText(d *towpathv1.Demand) string {
	size := ""
	if d.GetSize() > 1 {
		size = fmt.Sprintf(" n=%d", d.GetSize())
	}
	return fmt.Sprintf("%s%s x%d", d.GetKind(), size, d.GetCount())
}

// bridgeNames lists the bridges that a route crosses, each once, in the order of crossing.
func bridgeNames(r *towpathv1.Route) []string {
	var names []string
	seen := map[string]bool{}
	var walk func([]*towpathv1.Leg)
	walk = func(legs []*towpathv1.Leg) {
		for _, l := range legs {
			if b := l.GetBridge(); b != "" && !seen[b] {
				seen[b] = true
				names = append(names, b)
			}
			walk(l.GetParts())
		}
	}
	walk(r.GetLegs())
	return names
}
