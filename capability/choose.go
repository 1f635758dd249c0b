package capability

import (
	"math/bits"
	"slices"
)

// choice combines one derivation per demand into a route.
//
// A toll is not a sum over demands: it may hold the cube of all rows together. So every combination is judged as a whole,
// by the toll of its total load.
type choice struct {
	*deriver
	groups   []group
	maxBytes float64

	pick []int // the way taken, by group
	now  key   // of pick

	slots  []int    // nodes that occur in a way, in the order of a Load
	slot   []int    // the reverse, by node
	counts []int    // items by slot
	filled []uint64 // bit s mod 64 of word s/64 is set where counts[s] is not zero
	needs  []int    // demands that have an item of a kind that the sheet needs, by need
	key    key      // running totals: inexact and crossings
	buffer Load
	work   int // items looked at, the measure of effort: it is the same on every machine
}

// group is one demand with its ways and their floor.
type group struct {
	demand Demand
	at     int
	ways   []*derivation
	floor  *derivation // a load that every way's load dominates, with the merits of all ways
	probes []key       // bounds on all choices that take a way, by way
	alone  float64     // seconds that the group adds at least to what others take, if tolls mount and floor is nothing
}

// Bounds on the effort, in items looked at (some ten nanoseconds each).
const (
	descentWork = 1_000_000
	boundWork   = 1_000_000
)

// search settles pick and now. It returns "" when they are proven best, else why they are not.
func (c *choice) search() (doubt string) {
	root := c.probe()
	for k := range c.groups {
		c.pick[k] = best(c.groups[k].probes)
	}
	c.decide()
	c.now = c.judge()
	c.moveKinds()
	c.moveDemands()
	if c.now.compare(root) == 0 {
		return ""
	}
	return c.bound(root)
}

// prepare lays out slots and floors.
func (c *choice) prepare() {
	c.slot = make([]int, len(c.nodes))
	for k := range c.groups {
		for _, w := range c.groups[k].ways {
			for _, p := range w.load {
				c.slot[p.at] = 1
			}
		}
	}
	for _, at := range c.rising {
		if c.slot[at] != 0 {
			c.slot[at] = len(c.slots)
			c.slots = append(c.slots, at)
		}
	}
	c.counts = make([]int, len(c.slots))
	c.filled = make([]uint64, (len(c.slots)+63)/64)
	c.needs = make([]int, len(c.sheet.Needs))
	c.pick = make([]int, len(c.groups))
	c.buffer = make(Load, 0, len(c.slots))
}

// floor finds the largest load that dominates all ways' loads: for every kind and size, the number of items from that size
// on is the least that any way has.
func (c *choice) floor(ways []*derivation) *derivation {
	if len(ways) == 1 {
		return ways[0]
	}
	f := &derivation{crossings: ways[0].crossings}
	var places []int
	for _, w := range ways {
		f.merits |= w.merits
		f.crossings = min(f.crossings, w.crossings)
		for _, p := range w.load {
			places = append(places, p.at)
		}
	}
	slices.Sort(places)
	places = slices.Compact(places)
	given := 0
	for k, at := range places {
		if k > 0 && c.nodes[places[k-1]].kind != c.nodes[at].kind {
			given = 0
		}
		least := most
		for _, w := range ways {
			from := 0
			for _, p := range w.load {
				if p.at <= at && c.nodes[p.at].kind == c.nodes[at].kind {
					from = add(from, p.count)
				}
			}
			least = min(least, from)
		}
		if least > given {
			f.load = append(f.load, part{at, least - given})
			given = least
		}
	}
	return f
}

// put adds a way for a group, or takes it away with sign -1.
func (c *choice) put(w *derivation, k, sign int) {
	for _, p := range w.load {
		s := c.slot[p.at]
		c.counts[s] += sign * times(p.count, c.groups[k].demand.Count)
		if bit := uint64(1) << (s & 63); c.counts[s] != 0 {
			c.filled[s>>6] |= bit
		} else {
			c.filled[s>>6] &^= bit
		}
	}
	c.credit(w, sign)
}

// credit keeps account of what counts beside the load.
func (c *choice) credit(w *derivation, sign int) {
	for n := range c.needs {
		if w.merits&(2<<n) != 0 {
			c.needs[n] += sign
		}
	}
	if w.merits&exactMerit == 0 {
		c.key.inexact += sign
	}
	c.key.crossings += sign * w.crossings
}

// clear takes everything away.
func (c *choice) clear() {
	clear(c.counts)
	clear(c.filled)
	clear(c.needs)
	c.key = key{}
}

// decide puts every group on its way, and nothing else.
func (c *choice) decide() {
	c.clear()
	for k := range c.groups {
		c.put(c.groups[k].ways[c.pick[k]], k, 1)
	}
}

// move changes the way of a group, without judging it.
func (c *choice) move(k, way int) {
	c.put(c.groups[k].ways[c.pick[k]], k, -1)
	c.pick[k] = way
	c.put(c.groups[k].ways[way], k, 1)
}

// toll evaluates what is put.
func (c *choice) toll() Toll {
	c.buffer = c.buffer[:0]
	for at, word := range c.filled {
		for ; word != 0; word &= word - 1 {
			s := at<<6 + bits.TrailingZeros64(word)
			n := c.nodes[c.slots[s]]
			c.buffer = append(c.buffer, Demand{Kind: n.kind, Size: n.size, Count: c.counts[s]})
		}
	}
	c.work += len(c.buffer) + 1
	return c.sheet.Toll(c.buffer)
}

// judge makes a key of what is put.
func (c *choice) judge() key { return c.weigh(c.toll()) }

// judgeWith does so for a bound: what is still to come takes some seconds more at least.
func (c *choice) judgeWith(ahead float64) key {
	t := c.toll()
	if ahead > 0 {
		t.Seconds = (t.Seconds + ahead) * (1 - shy)
	}
	return c.weigh(t)
}

// weigh makes a key of a toll and the running totals.
func (c *choice) weigh(t Toll) key {
	k := c.key
	k.seconds = coarse(t.Seconds)
	for _, n := range c.needs {
		if n == 0 {
			k.missing++
		}
	}
	if c.maxBytes > 0 && !(t.Bytes <= c.maxBytes) {
		k.over = coarse(t.Bytes)
	}
	return k
}

// probe puts every group at its floor, and judges every way of one group with the others there: a bound on every choice
// that takes the way. It returns the bound on all choices.
func (c *choice) probe() key {
	c.clear()
	for k := range c.groups {
		g := &c.groups[k]
		g.floor, g.probes = c.floor(g.ways), g.probes[:0]
		c.put(g.floor, k, 1)
	}
	root := c.judge()
	for k := range c.groups {
		g := &c.groups[k]
		if len(g.ways) == 1 {
			g.probes = append(g.probes, root)
			continue
		}
		c.put(g.floor, k, -1)
		for _, w := range g.ways {
			c.put(w, k, 1)
			g.probes = append(g.probes, c.judge())
			c.put(w, k, -1)
		}
		c.put(g.floor, k, 1)
	}
	return root
}

// best finds the first of the least keys.
func best(keys []key) int {
	at := 0
	for i := range keys {
		if keys[i].compare(keys[at]) < 0 {
			at = i
		}
	}
	return at
}

// moveKinds improves the choice by taking all demands of a kind the same way, whatever their sizes: in a model with a
// thousand sizes of one kind this settles nearly everything at little cost.
func (c *choice) moveKinds() {
	for from := 0; from < len(c.groups); {
		to := from
		var shapes []*derivation
		for ; to < len(c.groups) && c.groups[to].demand.Kind == c.groups[from].demand.Kind; to++ {
			for _, w := range c.groups[to].ways {
				if spot, found := slices.BinarySearchFunc(shapes, w, compareShapes); !found {
					shapes = slices.Insert(shapes, spot, w)
				}
			}
		}
		if to-from > 1 && len(shapes) > 1 {
			before := slices.Clone(c.pick[from:to])
			for _, shape := range shapes {
				for k := from; k < to; k++ {
					if i := slices.IndexFunc(c.groups[k].ways, func(w *derivation) bool { return compareShapes(w, shape) == 0 }); i >= 0 {
						c.move(k, i)
					}
				}
				if then := c.judge(); then.compare(c.now) < 0 {
					c.now = then
					copy(before, c.pick[from:to])
				} else {
					for k := from; k < to; k++ {
						c.move(k, before[k-from])
					}
				}
			}
		}
		from = to
	}
}

// moveDemands improves one demand at a time, until nothing improves or the effort is spent.
func (c *choice) moveDemands() {
	limit := c.work + descentWork
	for improved := true; improved; {
		improved = false
		for k := range c.groups {
			for i := range c.groups[k].ways {
				old := c.pick[k]
				if i == old {
					continue
				}
				if c.work > limit {
					return
				}
				c.move(k, i)
				if then := c.judge(); then.compare(c.now) < 0 {
					c.now, improved = then, true
				} else {
					c.move(k, old)
				}
			}
		}
	}
}
