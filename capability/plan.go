package capability

import (
	"cmp"
	"fmt"
	"slices"
)

// Options of a plan. The zero value allows exact bridges only and needs nothing but values.
type Options struct {
	Allow    []Exactness // kinds of exactness allowed beside Exact
	Need     Lifts       // what every bridge and the sheet must bring back
	MaxBytes float64     // memory allowed to the solve; 0 for no limit
	Disabled []string    // bridges not to use
}

// Proposal is what planning found for one sheet: a route, or why there is none.
type Proposal struct {
	Sheet       *Sheet
	Route       *Route
	RunnersUp   []*Route // best route with another decision for one demand, cheapest first
	Unreachable *Unreachable
}

// Unreachable says why a sheet cannot serve a model.
type Unreachable struct {
	Demands []Demand // that nothing carries there
	Reasons []string // with what was tried and what would help
}

// Plan finds the cheapest route to every sheet, sheets sorted by name. The result depends on the sets of demands, rules
// and sheets, not on their order.
func Plan(demands []Demand, rules []Rule, sheets []*Sheet, o Options) []Proposal {
	byFrom := map[Kind][]Rule{}
	for _, r := range rules {
		allowed := r.Exactness() == Exact || slices.Contains(o.Allow, r.Exactness())
		if allowed && r.Lifts()&o.Need == o.Need && !slices.Contains(o.Disabled, r.ID()) {
			byFrom[r.From()] = append(byFrom[r.From()], r)
		}
	}
	for _, list := range byFrom {
		slices.SortFunc(list, func(a, b Rule) int { return cmp.Compare(a.ID(), b.ID()) })
	}
	demands = slices.Clone(demands)
	slices.SortFunc(demands, compareDemands)
	sheets = slices.Clone(sheets)
	slices.SortFunc(sheets, func(a, b *Sheet) int { return cmp.Compare(a.Name, b.Name) })
	var out []Proposal
	for _, s := range sheets {
		out = append(out, propose(demands, byFrom, s, o))
	}
	return out
}

// propose plans for one sheet.
func propose(demands []Demand, byFrom map[Kind][]Rule, s *Sheet, o Options) Proposal {
	refuse := func(d []Demand, reasons ...string) Proposal {
		return Proposal{Sheet: s, Unreachable: &Unreachable{Demands: d, Reasons: reasons}}
	}
	if missing := o.Need &^ s.Returns; missing != 0 {
		return refuse(nil, fmt.Sprintf("%s does not return %s, which the job needs", s.Name, missing))
	}
	way := &deriver{sheet: s, byFrom: byFrom}
	c := &choice{demands: demands, sheet: s, pick: make([]int, len(demands))}
	var lost []Demand
	var reasons []string
	for _, d := range demands {
		found := way.derive(node{d.Kind, d.Size}, nil)
		if len(found) == 0 {
			lost = append(lost, d)
			reasons = append(reasons, way.explain(d))
		}
		c.groups = append(c.groups, found)
	}
	if len(lost) > 0 {
		return refuse(lost, reasons...)
	}
	proven := c.search() && !way.capped
	route := c.route(proven)
	for _, k := range s.Needs {
		if !slices.ContainsFunc(route.Load, func(d Demand) bool { return d.Kind == k }) {
			return refuse(nil, fmt.Sprintf("%s needs at least one %s and the cheapest route has none; use another sheet", s.Name, k))
		}
	}
	if o.MaxBytes > 0 && route.Toll.Bytes > o.MaxBytes {
		return refuse(nil, fmt.Sprintf("%s would need %s, and %s are allowed; raise the limit, or use a sheet that takes more kinds natively", s.Name, bytesText(route.Toll.Bytes), bytesText(o.MaxBytes)))
	}
	return Proposal{Sheet: s, Route: route, RunnersUp: c.runnersUp(proven)}
}

// explain says what was tried for a demand that has no derivation.
func (s *deriver) explain(d Demand) string {
	text := fmt.Sprintf("%s of size %d: %s does not take it", d.Kind, d.Size, s.sheet.Name)
	if limit, ok := s.sheet.Takes[d.Kind]; ok {
		text = fmt.Sprintf("%s of size %d: %s takes it up to size %d", d.Kind, d.Size, s.sheet.Name, limit)
	}
	tried := 0
	for _, r := range s.byFrom[d.Kind] {
		parts, ok := r.Yields(d.Size)
		if !ok {
			continue
		}
		for _, p := range parts {
			if len(s.derive(node{p.Kind, p.Size}, []node{{d.Kind, d.Size}})) == 0 {
				text += fmt.Sprintf("; bridge %s leads to %s of size %d, which goes no further", r.ID(), p.Kind, p.Size)
				tried++
				break
			}
		}
	}
	if tried == 0 {
		text += ", and no bridge leaves it"
	}
	return text
}
