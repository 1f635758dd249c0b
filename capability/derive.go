package capability

import (
	"cmp"
	"slices"
)

// most is where counts stop. A tower of rules may double counts more often than an int can bear; so many items fit into
// no machine, and the sum over any model's demands still fits into an int.
const most = 1 << 40

func add(a, b int) int { return min(a+b, most) }

func times(a, b int) int {
	if a > 0 && b > most/a {
		return most
	}
	return a * b
}

// derivation is one way of a single item at a node down to native kinds. It never changes once made.
type derivation struct {
	at        int
	crossed   *edge         // nil where the item is native
	parts     []*derivation // one per part of crossed
	load      []part        // sorted by node
	crossings int           // bridges crossed
	merits    merits
	kinds     uint64 // bit k mod 64 is set if kind number k is in load
	passes    uint64 // bit i mod 64 is set if the way passes node i
}

// merits are what a derivation brings beside a small load: bit 0 says that all its bridges are exact, the others that
// it has items of a kind without which the sheet refuses to work.
type merits uint64

const exactMerit merits = 1

// frontierLimit bounds the derivations kept at a node. The catalogue yields fewer than forty, in between and in the end; the
// limit guards against rules that nobody has written yet, and a route that met it is not called proven.
const frontierLimit = 96

// crossingLimit bounds the bridges of one derivation, which is a tree: a chain of rules that yield two parts each grows
// exponentially. The catalogue's longest has fewer than ten.
const crossingLimit = 1000

// passLimit bounds how often all nodes are looked at again; derivations without repetition are shorter than that.
const passLimit = 1000

// deriver finds the derivations of every node under one sheet.
//
// It works like the shortest-path method of Bellman and Ford (1958, from memory), with sets of derivations that no other
// dominates in place of lengths: a node's set is made of its parts' sets, again and again until nothing changes. That
// does not follow paths and so needs no rule against going in circles: a derivation in which a node lies below itself is
// dominated by the one that takes the lower occurrence's way at once. Sets can improve only finitely often, for among
// multisets of finitely many nodes there is no endless descent.
type deriver struct {
	*network
	sheet  *Sheet
	front  [][]*derivation // by node, the best first
	capped bool

	items []part           // scratch for a load being added up
	ways  [2][]*derivation // scratch for the ways of the first parts of a crossing
	pool  pool
}

func derive(w *network, s *Sheet) *deriver {
	d := &deriver{network: w, sheet: s, front: make([][]*derivation, len(w.nodes)), capped: w.capped}
	dirty := make([]bool, len(w.nodes))
	for i := range dirty {
		dirty[i] = true
	}
	var now []*derivation
	for again, pass := true, 0; again; pass++ {
		if pass == passLimit {
			d.capped = true
			break
		}
		again = false
		for _, i := range w.order {
			if !dirty[i] {
				continue
			}
			dirty[i] = false
			now = d.best(now[:0], i)
			if slices.Equal(now, d.front[i]) {
				continue
			}
			d.front[i] = slices.Clone(now)
			for _, p := range w.parents[i] {
				dirty[p], again = true, true
			}
		}
	}
	return d
}

// native reports whether the sheet takes a node as it is.
func (d *deriver) native(i int) bool {
	limit, ok := d.sheet.Takes[d.nodes[i].kind]
	return ok && (limit == 0 || d.nodes[i].size <= limit)
}

// best appends the ways at a node that no other dominates, given the present sets of its parts, the first in a tie first.
func (d *deriver) best(keep []*derivation, i int) []*derivation {
	native := d.native(i)
	if native {
		keep = append(keep, d.asItIs(i))
	}
	for k := range d.edges[i] {
		if e := &d.edges[i][k]; !native || !d.last[e.rule] {
			keep = d.over(keep, i, e)
		}
	}
	slices.SortFunc(keep, compareWays)
	return keep
}

// asItIs is the native way.
func (d *deriver) asItIs(i int) *derivation {
	if old := d.front[i]; len(old) > 0 && old[0].crossed == nil {
		return old[0]
	}
	return &derivation{at: i, load: []part{{i, 1}}, merits: exactMerit | d.needed(i), kinds: 1 << (d.kinds[i] & 63), passes: 1 << (i & 63)}
}

// needed gives the merit of having an item of a kind that the sheet needs.
func (d *deriver) needed(i int) merits {
	// Sheets need one kind or two; what does not fit into the word goes unmarked, and is then found only by luck.
	if k := slices.Index(d.sheet.Needs, d.nodes[i].kind); k >= 0 && k < 62 {
		return 2 << k
	}
	return 0
}

// over offers to keep the ways that start with one crossing. Those that come back to the node itself are dominated by what
// they go on with there, and left out, unless they bring something that the sheet needs.
func (d *deriver) over(keep []*derivation, i int, e *edge) []*derivation {
	for _, p := range e.parts {
		if len(d.front[p.at]) == 0 {
			return keep
		}
	}
	first := derivation{at: i, crossed: e, crossings: 1, passes: 1 << (i & 63)}
	if d.rules[e.rule].Exactness() == Exact {
		first.merits = exactMerit
	}
	if len(e.parts) == 0 {
		return d.offer(keep, &first)
	}
	ways := append(d.ways[0][:0], &first)
	for k, p := range e.parts {
		into := d.ways[1-k%2][:0]
		if k == len(e.parts)-1 {
			into = keep
		}
		for _, m := range d.front[p.at] {
			if d.sheet.Needs == nil && m.visits(i) {
				continue
			}
			for _, w := range ways {
				if w.crossings+m.crossings > crossingLimit {
					d.capped = true
					continue
				}
				into = d.offer(into, d.with(w, m, p.count))
			}
		}
		if k == len(e.parts)-1 {
			return into
		}
		d.ways[1-k%2] = into
		ways = into
	}
	return keep
}

// visits reports whether a way passes a node.
func (w *derivation) visits(i int) bool {
	if w.passes&(1<<(i&63)) == 0 {
		return false
	}
	return w.at == i || slices.ContainsFunc(w.parts, func(p *derivation) bool { return p.visits(i) })
}

// with adds count items that go the way of m. The result is scratch, good until the next call.
func (d *deriver) with(w, m *derivation, count int) *derivation {
	d.items = addLoads(d.items[:0], w.load, m.load, count)
	d.pool.parts = append(append(d.pool.parts[:0], w.parts...), m)
	d.pool.next = derivation{
		at: w.at, crossed: w.crossed,
		parts:     d.pool.parts,
		load:      d.items,
		crossings: w.crossings + m.crossings,
		merits:    w.merits&m.merits&exactMerit | (w.merits|m.merits)&^exactMerit,
		kinds:     w.kinds | m.kinds,
		passes:    w.passes | m.passes,
	}
	return &d.pool.next
}

// addLoads appends a + count*b.
func addLoads(out, a, b []part, count int) []part {
	for len(a) > 0 || len(b) > 0 {
		switch {
		case len(b) == 0 || len(a) > 0 && a[0].at < b[0].at:
			out = append(out, a[0])
			a = a[1:]
		case len(a) == 0 || b[0].at < a[0].at:
			out = append(out, part{b[0].at, times(b[0].count, count)})
			b = b[1:]
		default:
			out = append(out, part{a[0].at, add(a[0].count, times(b[0].count, count))})
			a, b = a[1:], b[1:]
		}
	}
	return out
}

// compareWays puts the way first that wins a tie: exact before not, then fewer bridges (none at all: native), then the
// smaller names from the top down.
func compareWays(a, b *derivation) int {
	return cmp.Or(cmp.Compare(b.merits&exactMerit, a.merits&exactMerit), cmp.Compare(a.crossings, b.crossings), compareShapes(a, b))
}

// compareShapes orders ways by the bridges that they cross. Ways of different nodes may be equal.
func compareShapes(a, b *derivation) int {
	if a == b {
		return 0
	}
	if a.crossed == nil || b.crossed == nil {
		return cmp.Compare(len(a.parts), len(b.parts))
	}
	if c := cmp.Compare(a.crossed.rule, b.crossed.rule); c != 0 {
		return c
	}
	return slices.CompareFunc(a.parts, b.parts, compareShapes)
}

// offer adds a way to keep, where no way dominates another: of equal ones the one that comes first in a tie stays. The
// way may be scratch; it is copied when it is kept.
func (d *deriver) offer(keep []*derivation, w *derivation) []*derivation {
	for _, k := range keep {
		if d.dominates(k, w) && (!d.dominates(w, k) || compareWays(k, w) <= 0) {
			return keep
		}
	}
	rest := keep[:0]
	for _, k := range keep {
		if !d.dominates(w, k) {
			rest = append(rest, k)
		}
	}
	if len(rest) == frontierLimit {
		d.capped = true
		return rest
	}
	return append(rest, d.kept(w))
}

// kept returns the derivation of the node's present set that takes the same step and goes on by the very same
// derivations, or else a lasting copy: what does not change keeps its identity, and nodes above it need no second look.
func (d *deriver) kept(w *derivation) *derivation {
	for _, old := range d.front[w.at] {
		if old.crossed == w.crossed && slices.Equal(old.parts, w.parts) {
			return old
		}
	}
	return d.pool.copy(w)
}

// dominates reports whether a is at least as good as b under every toll that rises with sizes and counts: the items of a
// map one-to-one into items of b of the same kind and at least their size, and a has every merit of b.
//
// By Hall's theorem (1935, from memory) for nested sets such a map exists if for every kind and size, b has at least as
// many items from that size on. Loads are sorted by kind and falling size, so the numbers add up from the left.
func (d *deriver) dominates(a, b *derivation) bool {
	if b.merits&^a.merits != 0 || a.kinds&^b.kinds != 0 {
		return false
	}
	rest := b.load
	kind, need, have := -1, 0, 0
	for _, p := range a.load {
		if k := d.kinds[p.at]; k != kind {
			kind, need, have = k, 0, 0
			for len(rest) > 0 && d.kinds[rest[0].at] < kind {
				rest = rest[1:]
			}
		}
		need += p.count
		for len(rest) > 0 && rest[0].at <= p.at && d.kinds[rest[0].at] == kind {
			have += rest[0].count
			rest = rest[1:]
		}
		if have < need {
			return false
		}
	}
	return true
}

// leg writes a derivation down for a demand.
func (d *deriver) leg(w *derivation, of Demand) Leg {
	l := Leg{Demand: of}
	if w.crossed == nil {
		return l
	}
	l.Bridge = d.rules[w.crossed.rule].ID()
	for k, p := range w.crossed.parts {
		n := d.nodes[p.at]
		l.Parts = append(l.Parts, d.leg(w.parts[k], Demand{Kind: n.kind, Size: n.size, Count: p.count}))
	}
	return l
}

// exactness joins that of all bridges of a way. A plan never allows inner and outer ones in the same route.
func (d *deriver) exactness(w *derivation) Exactness {
	if w.crossed == nil || w.merits&exactMerit != 0 {
		return Exact
	}
	worst := d.rules[w.crossed.rule].Exactness()
	for _, p := range w.parts {
		worst = max(worst, d.exactness(p))
	}
	return worst
}
