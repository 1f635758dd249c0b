package capability

import "math"

// shy is taken off bounds that are sums of tolls, relative to the sum: many times what rounding can add to them, and far
// less than the digits of a toll that count.
const shy = 1e-12

// mount raises the bounds of a sheet whose tolls mount: beside what is settled, every open group costs at least what it
// costs by itself, on the cheapest of its ways. That is far above the floors where a group's ways end in different
// kinds, for then its floor is nothing. Both cannot be counted, so floors are given up if they bound less.
func (c *choice) mount(floors key) {
	c.clear()
	nothing := c.toll().Seconds
	total := 0.0
	for k := range c.groups {
		g := &c.groups[k]
		if len(g.ways) == 1 {
			continue
		}
		least := math.Inf(1)
		for _, w := range g.ways {
			c.put(w, k, 1)
			least = min(least, c.toll().Seconds)
			c.put(w, k, -1)
		}
		if g.alone = least - nothing; !(g.alone > 0) || math.IsInf(least, 0) {
			g.alone = 0
		}
		total += g.alone
	}
	for k := range c.groups {
		if g := &c.groups[k]; len(g.ways) == 1 {
			c.put(g.ways[0], k, 1)
		}
	}
	root := c.judgeWith(total)
	for k := range c.groups {
		g := &c.groups[k]
		if len(g.ways) == 1 {
			continue
		}
		for i, w := range g.ways {
			c.put(w, k, 1)
			g.probes[i].seconds = max(g.probes[i].seconds, c.judgeWith(total-g.alone).seconds)
			c.put(w, k, -1)
		}
		if root.seconds > floors.seconds {
			g.floor = &derivation{crossings: g.floor.crossings, merits: g.floor.merits}
		} else {
			g.alone = 0
		}
	}
}
