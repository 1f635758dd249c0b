package grid

import (
	"fmt"
	"math"
)

// topology is what of a network takes part, with buses numbered in the order of the table.
type topology struct {
	buses      []*Bus
	at         map[int]int // number of a bus, by its id
	lines      []line
	pairs      []pair
	generators []*Generator
}

// line is a branch in service between two buses that take part.
type line struct {
	*Branch
	number   int // place in the table, from 1
	from, to int
	pair     int
}

// pair is two connected buses, high > low, with the angle range of all lines between them: angle of high minus low.
type pair struct {
	high, low int
	angles    span
}

// box returns the rectangle that the limits leave to W_high,low.
func (p pair) box(buses []*Bus) (lower, upper complex128) {
	a, b := buses[p.high], buses[p.low]
	return p.angles.box(a.VMinPU*b.VMinPU, a.VMaxPU*b.VMaxPU)
}

// survey lists what takes part. It fails when the angle limits of parallel branches leave nothing.
func survey(n *Network) (*topology, error) {
	t := &topology{at: map[int]int{}}
	for k := range n.Buses {
		if b := &n.Buses[k]; b.Kind != isolatedBus {
			t.at[b.ID] = len(t.buses)
			t.buses = append(t.buses, b)
		}
	}
	numbers := map[[2]int]int{}
	for k := range n.Branches {
		b := &n.Branches[k]
		from, fromLive := t.at[b.From]
		to, toLive := t.at[b.To]
		if !b.InService || !fromLive || !toLive {
			continue
		}
		high, low, angles := from, to, b.angleSpan()
		if high < low {
			high, low, angles = low, high, angles.reversed()
		}
		p, known := numbers[[2]int{high, low}]
		if !known {
			p = len(t.pairs)
			numbers[[2]int{high, low}] = p
			t.pairs = append(t.pairs, pair{high, low, angles})
		}
		t.pairs[p].angles = t.pairs[p].angles.meet(angles)
		if s := t.pairs[p].angles; s.low > s.high {
			return nil, fmt.Errorf("network %q: branch %d: angle limits between bus %d and %d leave nothing within +-%d degrees (%.4g to %.4g)",
				n.Name, k, b.From, b.To, widestAngle, s.low*180/math.Pi, s.high*180/math.Pi)
		}
		t.lines = append(t.lines, line{b, k + 1, from, to, p})
	}
	for k := range n.Generators {
		g := &n.Generators[k]
		if _, live := t.at[g.Bus]; live && g.InService {
			t.generators = append(t.generators, g)
		}
	}
	return t, nil
}
