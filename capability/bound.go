package capability

import (
	"cmp"
	"fmt"
	"slices"
)

// openLimit is the number of open demands beyond which there is no hope of trying all combinations, and the effort is saved.
const openLimit = 64

// bound looks for a better choice than the present one by branch and bound, and settles for it. It returns "" when it has
// looked everywhere, else why it has not.
//
// The bound on all choices that share the decisions taken so far is the toll of those decisions' loads and the floors of
// the groups still open: every choice's load contains that load's items, one by one, at their size or a larger one, and
// a toll does not fall when sizes and counts grow.
func (c *choice) bound() (doubt string) {
	var open []int
	for k := range c.groups {
		g := &c.groups[k]
		alive := 0
		for i := range g.ways {
			if g.probes[i].compare(c.now) <= 0 {
				alive++
			}
		}
		if alive > 1 {
			open = append(open, k)
		}
	}
	if len(open) > openLimit {
		return fmt.Sprintf("%d demands are open, too many to try all", len(open))
	}
	// The decisions that matter most come first. Among equal choices the first in this order stays.
	spread := func(k int) float64 {
		p := c.groups[k].probes
		return p[len(p)-1].seconds - p[0].seconds
	}
	slices.SortStableFunc(open, func(a, b int) int { return cmp.Compare(abs(spread(b)), abs(spread(a))) })

	found := slices.Clone(c.pick)
	for _, k := range open {
		c.put(c.groups[k].ways[c.pick[k]], k, -1)
		c.put(c.groups[k].floor, k, 1)
	}
	limit, spent := c.work+boundWork, false
	var walk func(depth, side int)
	walk = func(depth, side int) {
		if c.work > limit {
			spent = true
			return
		}
		bound := c.judge()
		order := bound.compare(c.now)
		if order > 0 || order == 0 && (side > 0 || side == 0 && depth == len(open)) {
			return
		}
		if depth == len(open) {
			c.now = bound
			copy(found, c.pick)
			return
		}
		k := open[depth]
		g := &c.groups[k]
		c.put(g.floor, k, -1)
		for i, w := range g.ways {
			if g.probes[i].compare(c.now) > 0 {
				continue
			}
			c.pick[k] = i
			c.put(w, k, 1)
			walk(depth+1, cmp.Or(c.sideOf(open[:depth], found), cmp.Compare(i, found[k])))
			c.put(w, k, -1)
		}
		c.put(g.floor, k, 1)
	}
	walk(0, 0)
	for _, k := range open {
		c.put(c.groups[k].floor, k, -1)
		c.put(c.groups[k].ways[found[k]], k, 1)
	}
	copy(c.pick, found)
	if spent {
		return fmt.Sprintf("the search stopped with %d demands open", len(open))
	}
	return ""
}

// sideOf tells whether the present decisions come before (-1) or after (1) those found, or are the same so far.
func (c *choice) sideOf(open, found []int) int {
	for _, k := range open {
		if s := cmp.Compare(c.pick[k], found[k]); s != 0 {
			return s
		}
	}
	return 0
}

func abs(x float64) float64 { return max(x, -x) }
