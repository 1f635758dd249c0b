package capability

import (
	"cmp"
	"fmt"
	"slices"
)

// Options of a plan. The zero value allows exact bridges only and needs nothing but values.
type Options struct {
	Allow    []Exactness // kinds of exactness allowed beside Exact; a route never has both inner and outer bridges
	Need     Lifts       // what every bridge and the sheet must bring back
	MaxBytes float64     // memory allowed to the solve; 0 for no limit
	Disabled []string    // bridges not to use
	// MaxVisits bounds the exploration of what the demands can become, in nodes visited; 0 for DefaultVisits. Routes of
	// a plan that met it are not called proven.
	MaxVisits int
}

// DefaultVisits is far above what any model needs with the catalogue (some ten per demand), and takes well under a second.
const DefaultVisits = 200_000

// Proposal is what planning found for one sheet: a route, or why there is none.
type Proposal struct {
	Sheet       *Sheet
	Route       *Route
	RunnersUp   []*Route // best routes with another decision for one demand, cheapest first; Why says why they lost
	Unreachable *Unreachable
}

// Unreachable says why a sheet cannot serve a model.
type Unreachable struct {
	Demands []Demand // that nothing carries there
	Reasons []string // with what was tried and what would help
}

// Plan finds the cheapest route to every sheet, sheets sorted by name. The result depends on the sets of demands, rules
// and sheets, not on their order. Demands of the same kind and size count as one; those with sizes or counts below one
// ask for nothing.
func Plan(demands []Demand, rules []Rule, sheets []*Sheet, o Options) []Proposal {
	demands = merge(demands)
	sheets = slices.Clone(sheets)
	slices.SortStableFunc(sheets, func(a, b *Sheet) int {
		return cmp.Or(cmp.Compare(a.Name, b.Name), cmp.Compare(a.Backend, b.Backend), cmp.Compare(a.Version, b.Version))
	})
	rules = slices.Clone(rules)
	slices.SortStableFunc(rules, func(a, b Rule) int { return cmp.Compare(a.ID(), b.ID()) })
	roots := make([]node, len(demands))
	for k, d := range demands {
		roots[k] = node{d.Kind, d.Size}
	}
	visits := o.MaxVisits
	if visits <= 0 {
		visits = DefaultVisits
	}
	var networks []*network
	for _, allowed := range o.passes() {
		usable, out := o.sift(rules, allowed)
		networks = append(networks, explore(roots, usable, out, visits))
	}
	proposals := make([]Proposal, len(sheets))
	for k, s := range sheets {
		for i, w := range networks {
			if p := propose(demands, w, s, o); i == 0 || p.before(&proposals[k]) {
				proposals[k] = p
			}
		}
	}
	return proposals
}

// merge sorts demands and joins equal ones.
func merge(demands []Demand) []Demand {
	demands = slices.Clone(demands)
	slices.SortStableFunc(demands, compareDemands)
	out := demands[:0]
	for _, d := range demands {
		if d.Size < 1 || d.Count < 1 {
			continue
		}
		d.Count = min(d.Count, most)
		if last := len(out) - 1; last >= 0 && out[last].Kind == d.Kind && out[last].Size == d.Size {
			out[last].Count = add(out[last].Count, d.Count)
			out[last].Nonzeros += d.Nonzeros
			continue
		}
		out = append(out, d)
	}
	return out
}

// passes lists the sides on which bridges may err. When both are allowed, each is planned for by itself: what may lose
// points and may add points bounds nothing.
func (o *Options) passes() []Exactness {
	var out []Exactness
	for _, e := range []Exactness{Inner, Outer} {
		if slices.Contains(o.Allow, e) {
			out = append(out, e)
		}
	}
	if out == nil {
		out = []Exactness{Exact}
	}
	return out
}

// sift parts sorted rules into those that a plan may use and those that it may not, with the reason.
func (o *Options) sift(rules []Rule, allowed Exactness) (usable []Rule, out []barred) {
	for _, r := range rules {
		missing := o.Need &^ r.Lifts()
		switch {
		case slices.Contains(o.Disabled, r.ID()):
			out = append(out, barred{r, "is switched off"})
		case missing != 0:
			out = append(out, barred{r, fmt.Sprintf("does not bring back %s, which the job needs", missing)})
		case r.Exactness() == Exact || r.Exactness() == allowed:
			usable = append(usable, r)
		case slices.Contains(o.Allow, r.Exactness()):
			out = append(out, barred{r, fmt.Sprintf("is %s, and does not mix with %s ones", r.Exactness(), allowed)})
		default:
			out = append(out, barred{r, fmt.Sprintf("is %s, which the job does not allow", r.Exactness())})
		}
	}
	return usable, out
}

// before reports whether a proposal for the same sheet, made on the other side of exactness, is better.
func (p *Proposal) before(q *Proposal) bool {
	if p.Route == nil || q.Route == nil {
		return p.Route != nil
	}
	return cmp.Or(cmp.Compare(coarse(p.Route.Toll.Seconds), coarse(q.Route.Toll.Seconds)), cmp.Compare(p.Route.Exactness, q.Route.Exactness)) < 0
}

// propose plans for one sheet.
func propose(demands []Demand, w *network, s *Sheet, o Options) Proposal {
	refuse := func(lost []Demand, reasons ...string) Proposal {
		return Proposal{Sheet: s, Unreachable: &Unreachable{Demands: lost, Reasons: reasons}}
	}
	if missing := o.Need &^ s.Returns; missing != 0 {
		return refuse(nil, fmt.Sprintf("%s does not return %s, which the job needs", s.Name, missing))
	}
	if s.Toll == nil {
		return refuse(nil, fmt.Sprintf("%s declares no toll, so nothing can be predicted for it", s.Name))
	}
	c := &choice{deriver: derive(w, s), maxBytes: o.MaxBytes}
	var lost []Demand
	for _, d := range demands {
		at := w.number[node{d.Kind, d.Size}]
		c.groups = append(c.groups, group{demand: d, at: at, ways: c.front[at]})
		if len(c.front[at]) == 0 {
			lost = append(lost, d)
		}
	}
	if len(lost) > 0 {
		return refuse(lost, c.explain(lost)...)
	}
	c.prepare()
	doubt := c.search()
	if c.capped {
		doubt = "there were too many ways to keep all"
	}
	route := c.route(doubt)
	if why := c.illegal(route); why != "" {
		return refuse(nil, why)
	}
	return Proposal{Sheet: s, Route: route, RunnersUp: c.runnersUp(route)}
}
