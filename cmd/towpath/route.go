package main

import (
	"fmt"
	"io"
	"strings"

	towpathv1 "towpath/proto/towpath/v1"
)

// writeRoute shows a route as a tree: a line per demand, below it what its bridge makes of it.
func writeRoute(w io.Writer, r *towpathv1.Route) {
	how := fmt.Sprintf("%d of %d demands cross a bridge", crossing(r.GetLegs()), len(r.GetLegs()))
	if r.GetNative() {
		how = "native: no bridge is crossed"
	}
	fmt.Fprintf(w, "route to %s  (%s; %s)\n", r.GetSheet(), how, exactnessWord(r.GetExactness()))
	for _, l := range r.GetLegs() {
		writeLeg(w, l, "  ")
	}
	if len(r.GetLoad()) > 0 && !r.GetNative() {
		loads := make([]string, len(r.GetLoad()))
		for i, d := range r.GetLoad() {
			loads[i] = demandText(d)
		}
		fmt.Fprintf(w, "  the back end takes  %s\n", strings.Join(loads, ",  "))
	}
}

func writeLeg(w io.Writer, l *towpathv1.Leg, indent string) {
	if l.GetBridge() == "" {
		fmt.Fprintf(w, "%s%s\n", indent, demandText(l.GetDemand()))
		return
	}
	fmt.Fprintf(w, "%s%s  over %s\n", indent, demandText(l.GetDemand()), l.GetBridge())
	for _, p := range l.GetParts() {
		writeLeg(w, p, indent+"    ")
	}
}

// demandText writes a demand as "12 x map/complex/lorentz of 2".
func demandText(d *towpathv1.Demand) string {
	text := fmt.Sprintf("%d x %s", d.GetCount(), d.GetKind())
	if d.GetSize() > 1 {
		text += fmt.Sprintf(" of %d", d.GetSize())
	}
	return text
}

func crossing(legs []*towpathv1.Leg) int {
	n := 0
	for _, l := range legs {
		if l.GetBridge() != "" {
			n++
		}
	}
	return n
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
