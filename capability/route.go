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
	Proven    bool // cheapest under the sheet's toll, not only the best found
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
