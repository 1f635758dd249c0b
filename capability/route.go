package capability

// Leg is the decision for one demand: native when Bridge is empty, else the bridge and the legs of the parts
// that one demand becomes.
type Leg struct {
	Demand Demand
	Bridge string
	Parts  []Leg
}

// Route is the chosen way of one model to one sheet.
type Route struct {
	Sheet     *Sheet
	Legs      []Leg // one per demand of the model, in the order of Summarize
	Load      Load
	Toll      Toll
	Exactness Exactness
	Proven    bool   // cheapest under the sheet's toll, not only the best found
	Doubt     string // why it is not proven, if it is not
	Why       string // of a runner-up: why it lost
}

// Native reports whether no bridge is crossed.
func (r *Route) Native() bool {
	for _, l := range r.Legs {
		if l.Bridge != "" {
			return false
		}
	}
	return true
}

// Shares breaks the toll down: for every leg, how much less the toll would be without it. Tolls are not sums, so shares
// need not add up to the toll: they come to more where cubes of totals rule, to less where there is a cost of starting.
func (r *Route) Shares() []Toll {
	shares := make([]Toll, len(r.Legs))
	for k := range r.Legs {
		alone := map[node]int{}
		r.Legs[k].drop(r.Legs[k].Demand.Count, alone)
		rest := make(Load, 0, len(r.Load))
		for _, d := range r.Load {
			if d.Count -= alone[node{d.Kind, d.Size}]; d.Count > 0 {
				rest = append(rest, d)
			}
		}
		t := r.Sheet.Toll(rest)
		shares[k] = Toll{Seconds: max(0, r.Toll.Seconds-t.Seconds), Bytes: max(0, r.Toll.Bytes-t.Bytes)}
	}
	return shares
}

// drop counts the native items at the end of a leg that stands for count items.
func (l *Leg) drop(count int, into map[node]int) {
	if l.Bridge == "" {
		at := node{l.Demand.Kind, l.Demand.Size}
		into[at] = add(into[at], count)
		return
	}
	for k := range l.Parts {
		l.Parts[k].drop(times(count, l.Parts[k].Demand.Count), into)
	}
}
