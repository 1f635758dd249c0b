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
// A bound on all choices that share the decisions taken so far is the toll of those decisions' loads and the floors of
// the groups still open: every choice's load contains that load's items, one by one, at their size or a larger one, and
// a toll does not fall when sizes and counts grow. Where tolls mount, another is the toll of the decisions with what each
// open group costs by itself at least.
func (c *choice) bound(root key) (doubt string) {
	open := c.narrow(root)
	if len(open) > openLimit {
		return fmt.Sprintf("%d demands are open, too many to try all", len(open))
	}
	// The decisions that cost most come first: whichever way they go, they raise the bound for all that follow. Among
	// equal choices the first in this order stays.
	slices.SortStableFunc(open, func(a, b int) int {
		x, y := c.groups[a].probes, c.groups[b].probes
		return cmp.Compare(y[best(y)].seconds, x[best(x)].seconds)
	})

	found := slices.Clone(c.pick)
	ahead := make([]float64, len(open)+1) // seconds that the groups from here on add at least
	for d := len(open) - 1; d >= 0; d-- {
		ahead[d] = ahead[d+1] + c.groups[open[d]].alone
	}
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
		bound := c.judgeWith(ahead[depth])
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

// narrow drops the ways that no better choice can take, because the bound on choices that take them is above the present
// choice. With fewer ways bounds rise, and then more can be dropped, until nothing changes. It returns the groups that
// still have several ways.
func (c *choice) narrow(root key) (open []int) {
	limit := c.work + boundWork
	for {
		if c.sheet.Mounts {
			c.mount(root)
		}
		open = open[:0]
		fewer := false
		for k := range c.groups {
			g := &c.groups[k]
			taken := g.ways[c.pick[k]]
			alive := make([]*derivation, 0, len(g.ways))
			for i, w := range g.ways {
				if w == taken {
					c.pick[k] = len(alive)
				}
				if w == taken || g.probes[i].compare(c.now) <= 0 {
					alive = append(alive, w)
				}
			}
			fewer = fewer || len(alive) < len(g.ways)
			g.ways = alive
			if len(alive) > 1 {
				open = append(open, k)
			}
		}
		if !fewer || len(open) == 0 || c.work > limit {
			c.decide()
			return open
		}
		root = c.probe()
	}
}
