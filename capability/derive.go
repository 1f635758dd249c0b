package capability

import (
	"cmp"
	"maps"
	"slices"
)

// node is a kind at a size.
type node struct {
	kind Kind
	size int
}

// derivation is one way of a single demand down to native kinds.
type derivation struct {
	leg       Leg
	load      map[node]int
	crossings int    // bridges crossed
	name      string // ids of the bridges, for ties
	exactness Exactness
}

// frontierLimit bounds the derivations kept for one demand. The catalogue yields fewer than ten; the limit is a guard
// against rules that nobody has written yet, and a route that met it is not called proven.
const frontierLimit = 64

// deriver finds the derivations of demands under one sheet.
type deriver struct {
	sheet  *Sheet
	byFrom map[Kind][]Rule
	capped bool
}

// derive lists the derivations of one demand that no other dominates.
//
// A path does not come back to a kind at the same or a larger size. Nothing is lost: rules are monotone, so whatever
// the larger one can become, the smaller one on the same path can become with no more, and that derivation dominates.
// Sizes of a kind therefore fall strictly along a path, which ends it.
func (s *deriver) derive(n node, path []node) []derivation {
	for _, p := range path {
		if p.kind == n.kind && p.size <= n.size {
			return nil
		}
	}
	var all []derivation
	demand := Demand{Kind: n.kind, Size: n.size, Count: 1}
	limit, native := s.sheet.Takes[n.kind]
	if native = native && (limit == 0 || n.size <= limit); native {
		all = append(all, derivation{leg: Leg{Demand: demand}, load: map[node]int{n: 1}})
	}
	path = append(path[:len(path):len(path)], n)
	for _, r := range s.byFrom[n.kind] {
		parts, ok := r.Yields(n.size)
		if !ok || native && r.LastResort() {
			continue
		}
		ways := []derivation{{leg: Leg{Demand: demand, Bridge: r.ID()}, load: map[node]int{}, crossings: 1, name: r.ID(), exactness: r.Exactness()}}
		for _, p := range parts {
			ways = s.prune(combine(ways, s.derive(node{p.Kind, p.Size}, path), p))
		}
		all = append(all, ways...)
	}
	return s.prune(all)
}

// combine adds every way of a part to every way found so far.
func combine(ways, more []derivation, p Demand) []derivation {
	var out []derivation
	for _, w := range ways {
		for _, m := range more {
			d := derivation{leg: w.leg, load: maps.Clone(w.load), crossings: w.crossings + m.crossings, name: w.name + " " + m.name, exactness: worst(w.exactness, m.exactness)}
			leg := m.leg
			leg.Demand.Count = p.Count
			d.leg.Parts = append(slices.Clone(w.leg.Parts), leg)
			for n, k := range m.load {
				d.load[n] += k * p.Count
			}
			out = append(out, d)
		}
	}
	return out
}

// worst joins the exactness of two bridges. Inner and outer together promise nothing; the planner is only asked for one
// of them at a time.
func worst(a, b Exactness) Exactness { return max(a, b) }

// prune drops dominated derivations; of equal ones the one with fewer crossings, then the smaller name stays.
func (s *deriver) prune(all []derivation) []derivation {
	slices.SortStableFunc(all, func(a, b derivation) int {
		return cmp.Or(cmp.Compare(a.crossings, b.crossings), cmp.Compare(a.name, b.name))
	})
	var keep []derivation
	for _, d := range all {
		if slices.ContainsFunc(keep, func(k derivation) bool { return dominates(k.load, d.load) }) {
			continue
		}
		keep = slices.DeleteFunc(keep, func(k derivation) bool { return dominates(d.load, k.load) })
		keep = append(keep, d)
	}
	if len(keep) > frontierLimit {
		keep, s.capped = keep[:frontierLimit], true
	}
	return keep
}

// dominates reports whether the items of a map one-to-one into items of b of the same kind and at least their size: then
// no toll that rises with sizes and counts finds a dearer than b. By Hall's theorem for nested sets it is enough that,
// for every size, b has at least as many items from that size on as a.
func dominates(a, b map[node]int) bool {
	for n := range a {
		need, have := 0, 0
		for m, c := range a {
			if m.kind == n.kind && m.size >= n.size {
				need += c
			}
		}
		for m, c := range b {
			if m.kind == n.kind && m.size >= n.size {
				have += c
			}
		}
		if have < need {
			return false
		}
	}
	return true
}
