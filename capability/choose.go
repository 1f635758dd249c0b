package capability

import "slices"

// choice combines one derivation per demand.
type choice struct {
	demands []Demand
	groups  [][]derivation
	sheet   *Sheet
	pick    []int // the derivation taken, by demand
	toll    Toll
}

// exactLimit is the number of combinations up to which all are tried; beyond it the search improves one demand at a
// time until nothing improves, and does not call its result proven.
const exactLimit = 20_000

// slight is the relative difference below which two tolls tie; ties keep the earlier choice, which has fewer bridges and
// smaller names. Tolls are predictions with two good digits at most.
const slight = 1e-9

// search settles pick and reports whether it is proven cheapest under the sheet's toll.
func (c *choice) search() (proven bool) {
	c.toll = c.price()
	c.descend()
	combinations := 1
	for _, g := range c.groups {
		if combinations *= len(g); combinations > exactLimit {
			return false
		}
	}
	// Branch and bound: a toll rises with the load, so what is decided already bounds what follows.
	best := slices.Clone(c.pick)
	least := c.toll
	var walk func(k int)
	walk = func(k int) {
		t := c.sheet.Toll(c.load(k))
		if k == len(c.groups) {
			if t.Seconds < least.Seconds*(1-slight) {
				least = t
				copy(best, c.pick)
			}
			return
		}
		if k > 0 && t.Seconds >= least.Seconds {
			return
		}
		for i := range c.groups[k] {
			c.pick[k] = i
			walk(k + 1)
		}
	}
	walk(0)
	c.pick, c.toll = best, least
	return true
}

// descend improves one demand at a time.
func (c *choice) descend() {
	for improved := true; improved; {
		improved = false
		for k := range c.groups {
			for i := range c.groups[k] {
				old := c.pick[k]
				c.pick[k] = i
				if t := c.price(); t.Seconds < c.toll.Seconds*(1-slight) {
					c.toll, improved = t, true
				} else {
					c.pick[k] = old
				}
			}
		}
	}
}

func (c *choice) price() Toll { return c.sheet.Toll(c.load(len(c.groups))) }

// load adds up what the first n demands ask of the sheet.
func (c *choice) load(n int) Load {
	sum := map[node]int{}
	for k := range n {
		for at, count := range c.groups[k][c.pick[k]].load {
			sum[at] += count * c.demands[k].Count
		}
	}
	l := make(Load, 0, len(sum))
	for at, count := range sum {
		l = append(l, Demand{Kind: at.kind, Size: at.size, Count: count})
	}
	slices.SortFunc(l, compareDemands)
	return l
}

// route writes down the present pick.
func (c *choice) route(proven bool) *Route {
	r := &Route{Sheet: c.sheet, Load: c.load(len(c.groups)), Toll: c.price(), Proven: proven}
	for k, d := range c.demands {
		taken := c.groups[k][c.pick[k]]
		leg := taken.leg
		leg.Demand = d
		r.Legs = append(r.Legs, leg)
		r.Exactness = worst(r.Exactness, taken.exactness)
	}
	return r
}

// shownRunnersUp is how many of the routes that lost are told.
const shownRunnersUp = 3

// runnersUp lists the cheapest routes that differ from the chosen one in the decision for one demand.
func (c *choice) runnersUp(proven bool) []*Route {
	var out []*Route
	for k := range c.groups {
		kept := c.pick[k]
		for i := range c.groups[k] {
			if i != kept {
				c.pick[k] = i
				out = append(out, c.route(proven))
			}
		}
		c.pick[k] = kept
	}
	slices.SortStableFunc(out, func(a, b *Route) int {
		switch {
		case a.Toll.Seconds < b.Toll.Seconds:
			return -1
		case a.Toll.Seconds > b.Toll.Seconds:
			return 1
		}
		return 0
	})
	return out[:min(len(out), shownRunnersUp)]
}
