package capability

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strings"
)

// Graph is the capability graph: kinds, the bridges between them, and the sheets that take them.
type Graph struct {
	Kinds  []Kind // sorted by name
	Edges  []Edge // sorted by bridge
	Sheets []*Sheet
}

// Edge is one bridge: a hyperedge from a kind to a bag of kinds.
type Edge struct {
	Bridge    string
	From      Kind
	To        []Kind
	Exactness Exactness
}

// probes are sizes at which a rule is asked what it yields: some bridges apply to order 1 or 2 only, and yield fewer
// kinds at order 1.
var probes = []int{3, 2, 1}

// GraphOf draws the graph of rules and sheets.
func GraphOf(rules []Rule, sheets []*Sheet) Graph {
	kinds := map[Kind]bool{}
	var g Graph
	for _, r := range rules {
		e := Edge{Bridge: r.ID(), From: r.From(), Exactness: r.Exactness()}
		kinds[e.From] = true
		for _, n := range probes {
			parts, ok := r.Yields(n)
			if !ok {
				continue
			}
			for _, p := range parts {
				kinds[p.Kind] = true
				if !slices.Contains(e.To, p.Kind) {
					e.To = append(e.To, p.Kind)
				}
			}
			break
		}
		g.Edges = append(g.Edges, e)
	}
	for _, s := range sheets {
		for k := range s.Takes {
			kinds[k] = true
		}
	}
	g.Kinds = slices.SortedFunc(maps.Keys(kinds), func(a, b Kind) int { return cmp.Compare(a.String(), b.String()) })
	slices.SortFunc(g.Edges, func(a, b Edge) int { return cmp.Compare(a.Bridge, b.Bridge) })
	g.Sheets = slices.Clone(sheets)
	slices.SortFunc(g.Sheets, func(a, b *Sheet) int { return cmp.Compare(a.Name, b.Name) })
	return g
}

// String lists every kind with the sheets that take it and the bridges that leave it.
func (g Graph) String() string {
	var b strings.Builder
	for _, k := range g.Kinds {
		fmt.Fprintf(&b, "%s\n", k)
		var takers []string
		for _, s := range g.Sheets {
			if _, ok := s.Takes[k]; ok {
				takers = append(takers, s.Name)
			}
		}
		if len(takers) > 0 {
			fmt.Fprintf(&b, "  native to %s\n", strings.Join(takers, ", "))
		}
		for _, e := range g.Edges {
			if e.From != k {
				continue
			}
			var to []string
			for _, t := range e.To {
				to = append(to, t.String())
			}
			fmt.Fprintf(&b, "  %s -> %s\n", e.Bridge, strings.Join(to, " + "))
		}
	}
	return b.String()
}
