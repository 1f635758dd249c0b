package capability

import (
	"fmt"
	"math"
	"strings"
)

// String prints the route as a tree: the sheet with its toll, then every demand and what becomes of it.
func (r *Route) String() string {
	var b strings.Builder
	way := "lowered"
	if r.Native() {
		way = "native"
	}
	fmt.Fprintf(&b, "%s  %s  toll %s", r.Sheet.Name, way, r.Toll)
	if !r.Proven {
		b.WriteString("  (not proven cheapest)")
	}
	b.WriteByte('\n')
	for _, l := range r.Legs {
		l.print(&b, "  ")
	}
	return b.String()
}

func (l Leg) print(b *strings.Builder, indent string) {
	fmt.Fprintf(b, "%s%s", indent, l.Demand)
	if l.Bridge == "" {
		b.WriteString("  native\n")
		return
	}
	fmt.Fprintf(b, "  over %s\n", l.Bridge)
	for _, p := range l.Parts {
		p.print(b, indent+"  ")
	}
}

// String gives kind, size (where the kind has sizes) and count.
func (d Demand) String() string {
	if d.Kind.Separable() {
		return fmt.Sprintf("%s x%d", d.Kind, d.Count)
	}
	return fmt.Sprintf("%s n=%d x%d", d.Kind, d.Size, d.Count)
}

// String gives seconds and bytes for people.
func (t Toll) String() string {
	return secondsText(t.Seconds) + ", " + bytesText(t.Bytes)
}

func secondsText(s float64) string {
	switch {
	case math.IsNaN(s):
		return "unknown"
	case s >= 1:
		return fmt.Sprintf("%.3g s", s)
	case s >= 1e-3:
		return fmt.Sprintf("%.3g ms", s*1e3)
	}
	return fmt.Sprintf("%.3g us", s*1e6)
}

func bytesText(b float64) string {
	switch {
	case b >= 1e9:
		return fmt.Sprintf("%.3g GB", b/1e9)
	case b >= 1e6:
		return fmt.Sprintf("%.3g MB", b/1e6)
	}
	return fmt.Sprintf("%.3g kB", b/1e3)
}

// String lists what can be brought back.
func (l Lifts) String() string {
	var words []string
	for _, x := range []struct {
		bit  Lifts
		word string
	}{{LiftsValues, "values"}, {LiftsMultipliers, "multipliers"}, {LiftsInfeasibility, "certificates of infeasibility"}, {LiftsUnboundedness, "certificates of unboundedness"}} {
		if l&x.bit != 0 {
			words = append(words, x.word)
		}
	}
	return strings.Join(words, ", ")
}

// String prints the proposal: the route and what lost against it, or why there is none.
func (p *Proposal) String() string {
	if p.Route == nil {
		return fmt.Sprintf("%s  out of reach\n  %s\n", p.Sheet.Name, strings.Join(p.Unreachable.Reasons, "\n  "))
	}
	var b strings.Builder
	b.WriteString(p.Route.String())
	for _, r := range p.RunnersUp {
		fmt.Fprintf(&b, "  lost: %s, toll %s\n", r.difference(p.Route), r.Toll)
	}
	return b.String()
}

// difference names the first decision in which two routes differ.
func (r *Route) difference(other *Route) string {
	for k, l := range r.Legs {
		if l.text() != other.Legs[k].text() {
			return fmt.Sprintf("%s %s", l.Demand, l.text())
		}
	}
	return "no difference"
}

// text is the leg's tree of bridges in one line.
func (l Leg) text() string {
	if l.Bridge == "" {
		return "native"
	}
	var inner []string
	for _, p := range l.Parts {
		if t := p.text(); t != "native" {
			inner = append(inner, t)
		}
	}
	if len(inner) == 0 {
		return "over " + l.Bridge
	}
	return "over " + l.Bridge + " (" + strings.Join(inner, ", ") + ")"
}
