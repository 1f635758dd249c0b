package capability

import (
	"fmt"
	"math"
	"strings"
)

// shownLegs is the number of demands up to which each has lines of its own, with its share of the toll; beyond it,
// neighbours that differ in size only share one.
const shownLegs = 24

// String prints the route as a tree: the sheet with its toll, then every demand and what becomes of one of it, and at the
// end of its line how much less the toll would be without it.
func (r *Route) String() string {
	var b strings.Builder
	way := "lowered"
	if r.Native() {
		way = "native"
	}
	fmt.Fprintf(&b, "%s  %s  toll %s", r.Sheet.Name, way, r.Toll)
	if r.Exactness != Exact {
		fmt.Fprintf(&b, "  %s", r.Exactness)
	}
	if r.Doubt != "" {
		fmt.Fprintf(&b, "  (not proven cheapest: %s)", r.Doubt)
	}
	b.WriteByte('\n')
	if len(r.Legs) > shownLegs {
		r.fold(&b)
		return b.String()
	}
	shares := r.Shares()
	var t table
	for k, l := range r.Legs {
		t.leg(l, 1)
		t[len(t)-1-l.depth()].note = "share " + secondsText(shares[k].Seconds)
	}
	t.print(&b)
	return b.String()
}

// fold prints one line for every run of demands of one kind that go the same way.
func (r *Route) fold(b *strings.Builder) {
	var t table
	for from := 0; from < len(r.Legs); {
		first := &r.Legs[from]
		text, kind, count, to := first.text(), first.Demand.Kind, 0, from
		for ; to < len(r.Legs) && r.Legs[to].Demand.Kind == kind && r.Legs[to].text() == text; to++ {
			count = add(count, r.Legs[to].Demand.Count)
		}
		name := first.Demand.String()
		if last := &r.Legs[to-1]; to-from > 1 {
			name = fmt.Sprintf("%s n=%d..%d x%d", kind, first.Demand.Size, last.Demand.Size, count)
		}
		t = append(t, line{name: "  " + name, way: text})
		from = to
	}
	t.print(b)
}

// line is one line of a route, table all of them: what is asked for, what becomes of it, and a note.
type line struct{ name, way, note string }

type table []line

// leg appends the lines of a leg.
func (t *table) leg(l Leg, depth int) {
	way := "native"
	if l.Bridge != "" {
		way = "over " + l.Bridge
	}
	*t = append(*t, line{name: strings.Repeat("  ", depth) + l.Demand.String(), way: way})
	for _, p := range l.Parts {
		t.leg(p, depth+1)
	}
}

// depth counts the lines below a leg's own.
func (l *Leg) depth() int {
	n := 0
	for k := range l.Parts {
		n += 1 + l.Parts[k].depth()
	}
	return n
}

// print writes the lines in columns.
func (t table) print(b *strings.Builder) {
	var names, ways int
	for _, l := range t {
		names = max(names, len(l.name))
		if l.note != "" {
			ways = max(ways, len(l.way))
		}
	}
	for _, l := range t {
		if l.note == "" {
			fmt.Fprintf(b, "%-*s  %s\n", names, l.name, l.way)
			continue
		}
		fmt.Fprintf(b, "%-*s  %-*s  %s\n", names, l.name, ways, l.way, l.note)
	}
}

// String gives kind, size (where the kind has sizes) and count.
func (d Demand) String() string {
	return fmt.Sprintf("%s x%d", node{d.Kind, d.Size}, d.Count)
}

// String gives seconds and bytes for people.
func (t Toll) String() string {
	return secondsText(t.Seconds) + ", " + BytesText(t.Bytes)
}

func secondsText(s float64) string {
	switch {
	case math.IsNaN(s):
		return "unknown"
	case s == 0:
		return "0 s"
	case s >= 1:
		return fmt.Sprintf("%.3g s", s)
	case s >= 1e-3:
		return fmt.Sprintf("%.3g ms", s*1e3)
	}
	return fmt.Sprintf("%.3g us", s*1e6)
}

// BytesText gives a number of bytes for people, three digits and a decimal unit.
func BytesText(b float64) string {
	switch {
	case b >= 1e9:
		return fmt.Sprintf("%.3g GB", b/1e9)
	case b >= 1e6:
		return fmt.Sprintf("%.3g MB", b/1e6)
	}
	return fmt.Sprintf("%.3g kB", b/1e3)
}

// String is the word used in logs and messages.
func (e Exactness) String() string {
	switch e {
	case Exact:
		return "exact"
	case Inner:
		return "inner"
	case Outer:
		return "outer"
	}
	return "unknown-exactness"
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
	if last := len(words) - 1; last > 0 {
		return strings.Join(words[:last], ", ") + " and " + words[last]
	}
	return strings.Join(words, "")
}

// String prints the proposal: the route and what lost against it, or why there is none.
func (p *Proposal) String() string {
	if p.Route == nil {
		return fmt.Sprintf("%s  out of reach\n  %s\n", p.Sheet.Name, strings.Join(p.Unreachable.Reasons, "\n  "))
	}
	var b strings.Builder
	b.WriteString(p.Route.String())
	for _, r := range p.RunnersUp {
		fmt.Fprintf(&b, "  lost: %s: %s\n", r.difference(p.Route), r.Why)
	}
	return b.String()
}

// difference names the first decision in which two routes differ.
func (r *Route) difference(other *Route) string {
	for k := range r.Legs {
		if l := &r.Legs[k]; l.text() != other.Legs[k].text() {
			return fmt.Sprintf("%s %s", l.Demand, l.text())
		}
	}
	return "no difference"
}

// text is the leg's tree of bridges in one line.
func (l *Leg) text() string {
	if l.Bridge == "" {
		return "native"
	}
	var inner []string
	for k := range l.Parts {
		if t := l.Parts[k].text(); t != "native" {
			inner = append(inner, t)
		}
	}
	if len(inner) == 0 {
		return "over " + l.Bridge
	}
	return "over " + l.Bridge + " (" + strings.Join(inner, ", ") + ")"
}
