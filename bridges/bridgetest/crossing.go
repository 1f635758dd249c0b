package bridgetest

import (
	"fmt"

	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
)

// Subject is a bridge under test. LowersAs and LiftsAs, where set, stand in for it on the way there and on the way back:
// a bridge with a mistake in one direction. Without an engine the law of execution is left out.
type Subject struct {
	bridges.Bridge
	LowersAs, LiftsAs bridges.Bridge
	Engine            *Engine
}

// Engine solves what its sheet takes. Back ends are a layer above, so that their tests bring one along.
type Engine struct {
	Sheet capability.Sheet
	Solve func(*model.Model) (*model.Answer, error)
}

// crossing is a model on the far side.
type crossing struct {
	lowered *model.Model
	lift    func(*model.Answer) *model.Answer
}

// cross takes a model along a route, with the subject for its bridge.
func (s *Subject) cross(m *model.Model, route *capability.Route) (c crossing, err error) {
	there, err := bridges.Cross(m, route, s.catalogue(s.LowersAs))
	if err != nil {
		return c, err
	}
	if err := there.Lowered.Validate(); err != nil {
		return c, fmt.Errorf("the lowered model is broken: %w", err)
	}
	back, err := bridges.Cross(m, route, s.catalogue(s.LiftsAs))
	if err != nil {
		return c, err
	}
	return crossing{there.Lowered, back.Lift}, nil
}

// catalogue is the whole one, with the stand-in, if there is one, in the subject's place.
func (s *Subject) catalogue(standIn bridges.Bridge) []bridges.Bridge {
	if standIn == nil {
		standIn = s.Bridge
	}
	out := []bridges.Bridge{standIn}
	for _, b := range bridges.All() {
		if b.ID() != s.ID() {
			out = append(out, b)
		}
	}
	return out
}

// single is the route that takes every item of the bridge's kind across and leaves the rest; ok is false when there is
// no such item, or one that the bridge does not take: of another size, or a block whose bounds would have to go first.
func (s *Subject) single(m *model.Model) (route *capability.Route, ok bool) {
	for b := range m.Blocks {
		if kind, _, _ := capability.MeasureBlock(&m.Blocks[b]); kind == s.From() && m.Blocks[b].Bounds != nil {
			return nil, false
		}
	}
	route = &capability.Route{Sheet: &capability.Sheet{Name: "the far side"}}
	for _, d := range capability.Summarize(m) {
		leg := capability.Leg{Demand: d}
		if d.Kind == s.From() {
			parts, takes := s.Yields(d.Size)
			if !takes {
				return nil, false
			}
			leg.Bridge, ok = s.ID(), true
			for _, p := range parts {
				leg.Parts = append(leg.Parts, capability.Leg{Demand: p})
			}
		}
		route.Legs = append(route.Legs, leg)
	}
	return route, ok
}

// forced is the route to the engine that has to take the subject: the engine's sheet without the subject's kind,
// and no other bridge from that kind.
func (s *Subject) forced(m *model.Model) (route *capability.Route, ok bool) {
	sheet := s.Engine.Sheet
	takes := map[capability.Kind]int{}
	for k, limit := range sheet.Takes {
		if k != s.From() {
			takes[k] = limit
		}
	}
	sheet.Takes = takes
	rules := []capability.Rule{s.Bridge}
	for _, b := range bridges.All() {
		if b.From() != s.From() {
			rules = append(rules, b)
		}
	}
	p := capability.Plan(capability.Summarize(m), rules, []*capability.Sheet{&sheet}, capability.Options{})[0]
	if p.Route == nil {
		return nil, false
	}
	for _, leg := range p.Route.Legs {
		ok = ok || leg.Bridge == s.ID()
	}
	return p.Route, ok
}
