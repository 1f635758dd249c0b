package capability

import (
	"cmp"
	"fmt"
	"slices"
)

// shownRunnersUp is how many of the routes that lost are told.
const shownRunnersUp = 12

// runner is a choice that differs from the chosen one in the way of one group.
type runner struct {
	group int
	way   *derivation
	toll  Toll
	key   key
}

func compareRunners(a, b runner) int { return a.key.compare(b.key) }

// runnersUp lists routes that differ from the chosen one in the decision for one demand: the best one for every demand
// (for the largest ones, if there are many), then others as long as there is room. Every bridge that leaves a demand is
// looked at, even where dominance rules it out, so that each can be answered for.
func (c *choice) runnersUp(chosen *Route) []*Route {
	totals := make([]int, len(c.nodes))
	order := make([]int, len(c.groups))
	for k := range c.groups {
		c.groups[k].tally(c.groups[k].ways[c.pick[k]], 1, totals)
		order[k] = k
	}
	slices.SortStableFunc(order, func(a, b int) int {
		x, y := c.groups[a].demand, c.groups[b].demand
		return cmp.Or(cmp.Compare(y.Size, x.Size), cmp.Compare(y.Count, x.Count))
	})
	order = order[:min(len(order), shownRunnersUp)]
	slices.Sort(order)
	var shown, others []runner
	for _, k := range order {
		if found := c.alternatives(k, totals); len(found) > 0 {
			shown, others = append(shown, found[0]), append(others, found[1:]...)
		}
	}
	slices.SortStableFunc(others, compareRunners)
	shown = append(shown, others[:min(len(others), shownRunnersUp-len(shown))]...)
	slices.SortStableFunc(shown, compareRunners)
	var out []*Route
	for _, x := range shown {
		g := &c.groups[x.group]
		taken := g.ways[c.pick[x.group]]
		g.tally(taken, -1, totals)
		g.tally(x.way, 1, totals)
		r := &Route{Sheet: c.sheet, Legs: slices.Clone(chosen.Legs), Load: c.load(nil, totals), Toll: x.toll, Why: c.why(x, chosen)}
		g.tally(x.way, -1, totals)
		g.tally(taken, 1, totals)
		r.Legs[x.group] = c.leg(x.way, g.demand)
		r.Exactness = c.exactness(x.way)
		for k := range c.groups {
			if k != x.group {
				r.Exactness = max(r.Exactness, c.exactness(c.groups[k].ways[c.pick[k]]))
			}
		}
		out = append(out, r)
	}
	return out
}

// alternatives judges the other ways of a group: the best for every first step, best first. It leaves totals as they are.
func (c *choice) alternatives(k int, totals []int) []runner {
	g := &c.groups[k]
	taken := g.ways[c.pick[k]]
	g.tally(taken, -1, totals)
	c.credit(taken, -1)
	judge := func(w *derivation) runner {
		g.tally(w, 1, totals)
		c.credit(w, 1)
		c.buffer = c.load(c.buffer[:0], totals)
		x := runner{group: k, way: w, toll: c.sheet.Toll(c.buffer)}
		x.key = c.weigh(x.toll)
		c.credit(w, -1)
		g.tally(w, -1, totals)
		return x
	}
	var found []runner
	native := c.native(g.at)
	if native && taken.crossed != nil {
		found = append(found, judge(c.asItIs(g.at)))
	}
	for i := range c.edges[g.at] {
		e := &c.edges[g.at][i]
		if native && c.last[e.rule] {
			continue
		}
		var first []runner
		for _, w := range c.over(nil, g.at, e) {
			if compareShapes(w, taken) != 0 {
				first = append(first, judge(w))
			}
		}
		if len(first) > 0 {
			found = append(found, slices.MinFunc(first, compareRunners))
		}
	}
	c.credit(taken, 1)
	g.tally(taken, 1, totals)
	slices.SortStableFunc(found, compareRunners)
	return found
}

// why says what a runner-up lost by.
func (c *choice) why(x runner, chosen *Route) string {
	taken := c.groups[x.group].ways[c.pick[x.group]]
	switch {
	case x.key.missing > c.now.missing:
		return "it has no item of a kind that the sheet needs"
	case x.key.over > c.now.over:
		return fmt.Sprintf("it needs %s, which is over the limit", BytesText(x.toll.Bytes))
	case c.dominates(taken, x.way) && c.dominates(x.way, taken):
		return "it comes to the same, " + tie(taken, x.way)
	case c.dominates(taken, x.way):
		return "whatever the toll, it asks for all that the chosen way asks for, and more: " + compareTolls(x.toll, chosen.Toll)
	case x.key.seconds != c.now.seconds:
		return compareTolls(x.toll, chosen.Toll)
	}
	return "its toll is the same, " + tie(taken, x.way)
}

// tie says what decided between two ways of equal toll.
func tie(taken, lost *derivation) string {
	switch {
	case taken.merits&exactMerit != lost.merits&exactMerit:
		return "and it is not exact"
	case taken.crossings < lost.crossings:
		return "over more bridges"
	}
	return "and its name comes later"
}

// noticeable is the ratio from which two tolls differ in print.
const noticeable = 1.005

func compareTolls(lost, chosen Toll) string {
	if ratio := lost.Seconds / chosen.Seconds; ratio >= noticeable {
		return fmt.Sprintf("%.3g times the toll", ratio)
	}
	return fmt.Sprintf("%s more", secondsText(lost.Seconds-chosen.Seconds))
}
