package bridges

import (
	"fmt"
	"slices"

	"towpath/capability"
	"towpath/model"
)

// Crossing is a model on the far side of a route, and the way back.
type Crossing struct {
	Lowered *model.Model // always a minimization; may share arrays with the client's model

	d            *draft
	blocks, maps int    // of the client's model: the first ones of the draft
	bounded      []bool // which of those blocks have bounds
}

// Cross lowers a valid model along the route. The model is not modified. An error means that route and model, or a
// bridge's size rule and its lowering, do not agree: a bug, not the client's fault.
func Cross(m *model.Model, route *capability.Route, catalogue []Bridge) (*Crossing, error) {
	d := newDraft(m)
	g := &guide{d: d, bridges: make(map[string]Bridge, len(catalogue))}
	for _, b := range catalogue {
		g.bridges[b.ID()] = b
	}
	var items []item
	for i := range d.blocks {
		items = append(items, item{capability.OnBlock, i})
		if d.blocks[i].bounds != nil {
			items = append(items, item{capability.OnBounds, i})
		}
	}
	for k := range d.maps {
		if !d.maps[k].gone {
			items = append(items, item{capability.OnMap, k})
		}
	}
	// Bounds go first: a block cannot be lowered from under them.
	legs := slices.Clone(route.Legs)
	slices.SortStableFunc(legs, func(a, b capability.Leg) int {
		return boundsFirst(a) - boundsFirst(b)
	})
	if err := g.follow(legs, 1, items); err != nil {
		return nil, fmt.Errorf("cross to %s: %w", route.Sheet.Name, err)
	}
	x := &Crossing{Lowered: d.finish(m.Name), d: d, blocks: len(m.Blocks), maps: len(m.Constraints)}
	for i := range m.Blocks {
		x.bounded = append(x.bounded, m.Blocks[i].Bounds != nil)
	}
	return x, nil
}

func boundsFirst(l capability.Leg) int {
	if l.Demand.Kind.Place == capability.OnBounds {
		return 0
	}
	return 1
}

// guide carries the items of a draft over the bridges of a route.
type guide struct {
	d       *draft
	bridges map[string]Bridge
}

// group is a kind at a size.
type group struct {
	kind capability.Kind
	size int
}

// follow carries the items along the legs, each leg standing for times its count, and checks that legs and items agree.
func (g *guide) follow(legs []capability.Leg, times int, items []item) error {
	groups := map[group][]item{}
	counts := map[group]int{}
	var order []group
	for _, it := range items {
		kind, size, count := g.d.measure(it)
		k := group{kind, size}
		if groups[k] == nil {
			order = append(order, k)
		}
		groups[k] = append(groups[k], it)
		counts[k] += count
	}
	for _, leg := range legs {
		k := group{leg.Demand.Kind, leg.Demand.Size}
		if want := times * leg.Demand.Count; counts[k] != want {
			return fmt.Errorf("%s of size %d: %d predicted, %d built", k.kind, k.size, want, counts[k])
		}
		if err := g.carry(leg, times*leg.Demand.Count, groups[k]); err != nil {
			return err
		}
		delete(counts, k)
	}
	for _, k := range order {
		if counts[k] > 0 {
			return fmt.Errorf("%s of size %d: none predicted, %d built", k.kind, k.size, counts[k])
		}
	}
	return nil
}

// carry takes items over the leg's bridge, and what they become over the bridges of its parts.
func (g *guide) carry(leg capability.Leg, times int, items []item) error {
	if leg.Bridge == "" {
		return nil
	}
	b := g.bridges[leg.Bridge]
	if b == nil {
		return fmt.Errorf("bridge %s is not in the catalogue", leg.Bridge)
	}
	var made []item
	for _, it := range items {
		m, err := g.d.lower(it, b)
		if err != nil {
			return err
		}
		made = append(made, m...)
	}
	if err := g.follow(leg.Parts, times, made); err != nil {
		return fmt.Errorf("bridge %s: %w", leg.Bridge, err)
	}
	return nil
}
