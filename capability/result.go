package capability

import (
	"fmt"
	"math"
	"slices"
)

// route writes the present choice down.
func (c *choice) route(doubt string) *Route {
	r := &Route{Sheet: c.sheet, Legs: make([]Leg, len(c.groups)), Proven: doubt == "", Doubt: doubt}
	totals := make([]int, len(c.nodes))
	for k := range c.groups {
		g := &c.groups[k]
		w := g.ways[c.pick[k]]
		r.Legs[k] = c.leg(w, g.demand)
		r.Exactness = max(r.Exactness, c.exactness(w))
		g.tally(w, 1, totals)
	}
	r.Load = c.load(nil, totals)
	r.Toll = c.sheet.Toll(slices.Clone(r.Load))
	return r
}

// tally adds sign times what a group asks for on a way.
func (g *group) tally(w *derivation, sign int, totals []int) {
	for _, p := range w.load {
		totals[p.at] += sign * times(p.count, g.demand.Count)
	}
}

// load appends the items of totals, which go by node.
func (c *choice) load(l Load, totals []int) Load {
	for _, at := range c.rising {
		if totals[at] > 0 {
			l = append(l, Demand{Kind: c.nodes[at].kind, Size: c.nodes[at].size, Count: totals[at]})
		}
	}
	return l
}

// illegal says why the best choice must not be taken, if so. The search puts what is legal first, so then nothing is.
func (c *choice) illegal(r *Route) string {
	for n, k := range c.sheet.Needs {
		if c.needs[n] == 0 {
			return fmt.Sprintf("%s needs at least one %s and nothing in the model becomes one; use another sheet", c.sheet.Name, k)
		}
	}
	if s := r.Toll.Seconds; math.IsNaN(s) || math.IsInf(s, 0) {
		return fmt.Sprintf("%s predicts no finite toll (%v seconds)", c.sheet.Name, s)
	}
	if c.maxBytes > 0 && !(r.Toll.Bytes <= c.maxBytes) {
		return c.tooLarge(r)
	}
	return ""
}

// tooLarge says how much memory the leanest route needs, for what, and what would help.
func (c *choice) tooLarge(r *Route) string {
	text := fmt.Sprintf("%s needs %s on the leanest route, and %s are allowed", c.sheet.Name, BytesText(r.Toll.Bytes), BytesText(c.maxBytes))
	help := "raise the limit"
	if len(r.Legs) > 0 && len(r.Legs) <= shownLegs {
		shares := r.Shares()
		k := 0
		for i := range shares {
			if shares[i].Bytes > shares[k].Bytes {
				k = i
			}
		}
		text += fmt.Sprintf("; without %s it would be %s less", r.Legs[k].Demand, BytesText(shares[k].Bytes))
		if r.Legs[k].Bridge != "" {
			help += fmt.Sprintf(", or use a sheet that takes %s natively", r.Legs[k].Demand.Kind)
		}
	}
	return text + "; " + help
}
