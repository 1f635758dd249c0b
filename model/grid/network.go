package grid

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
)

// Kinds of buses that matter here. The others (load, generator and reference buses) are all alike to the
// relaxations, which know neither a reference angle nor fixed voltages.
const isolatedBus = 4

// Network is a power network as plain tables. Every field's name carries its unit.
type Network struct {
	Name       string      `json:"name"`
	Source     string      `json:"source,omitempty"`
	Licence    string      `json:"licence,omitempty"`
	BaseMVA    float64     `json:"base_mva"`
	Buses      []Bus       `json:"buses"`
	Branches   []Branch    `json:"branches"`
	Generators []Generator `json:"generators"`
}

// Bus is a node of the network.
type Bus struct {
	ID   int    `json:"id"`
	Name string `json:"name,omitempty"` // for people; may be empty
	// Kind 4 is an isolated bus, which is left out with everything at it.
	Kind       int     `json:"kind"`
	DemandMW   float64 `json:"demand_mw"`
	DemandMVAr float64 `json:"demand_mvar"`
	// ShuntMW is consumed, ShuntMVAr supplied, at a voltage of one per unit.
	ShuntMW   float64 `json:"shunt_mw"`
	ShuntMVAr float64 `json:"shunt_mvar"`
	BaseKV    float64 `json:"base_kv"`
	VMaxPU    float64 `json:"vmax_pu"`
	VMinPU    float64 `json:"vmin_pu"`
}

// Branch is a line or a transformer: an ideal transformer at the from side, then a series impedance with half of the
// charging susceptance at each end.
type Branch struct {
	From         int     `json:"from_bus"`
	To           int     `json:"to_bus"`
	ResistancePU float64 `json:"r_pu"`
	ReactancePU  float64 `json:"x_pu"`
	ChargingPU   float64 `json:"charging_b_pu"`
	// RatingMVA limits the apparent power at both ends; 0 means no limit.
	RatingMVA float64 `json:"rating_mva"`
	// Tap is the transformer's ratio; 0 means 1.
	Tap       float64 `json:"tap"`
	ShiftDeg  float64 `json:"shift_deg"`
	InService bool    `json:"in_service"`
	// AngleMinDeg and AngleMaxDeg limit the voltage angle of the from bus minus that of the to bus; both 0 means
	// no limit.
	AngleMinDeg float64 `json:"angle_min_deg"`
	AngleMaxDeg float64 `json:"angle_max_deg"`
}

// Generator injects power at a bus. CostPerH is a polynomial in the active power in MW, constant first, of degree two
// at most.
type Generator struct {
	Bus       int       `json:"bus"`
	QMaxMVAr  float64   `json:"qmax_mvar"`
	QMinMVAr  float64   `json:"qmin_mvar"`
	InService bool      `json:"in_service"`
	PMaxMW    float64   `json:"pmax_mw"`
	PMinMW    float64   `json:"pmin_mw"`
	CostPerH  []float64 `json:"cost_per_h"`
}

// Read reads a network written as JSON and validates it. Unknown fields are refused: a misspelt limit would otherwise
// silently be no limit.
func Read(r io.Reader) (*Network, error) {
	d := json.NewDecoder(r)
	d.DisallowUnknownFields()
	n := new(Network)
	if err := d.Decode(n); err != nil {
		return nil, fmt.Errorf("network tables: %w", err)
	}
	if err := n.Validate(); err != nil {
		return nil, err
	}
	return n, nil
}

// Validate reports the first thing in the tables that no relaxation can be built from, with its place: the id of a bus,
// the place in the table, from 1, of a branch or generator.
func (n *Network) Validate() error {
	fail := func(format string, a ...any) error {
		return fmt.Errorf("network %q: "+format, append([]any{n.Name}, a...)...)
	}
	if !positive(n.BaseMVA) {
		return fail("base_mva is %g; give the positive base power in MVA", n.BaseMVA)
	}
	seen := map[int]bool{}
	live := 0
	for _, b := range n.Buses {
		switch {
		case seen[b.ID]:
			return fail("bus %d is listed twice; number buses uniquely", b.ID)
		case !finite(b.DemandMW, b.DemandMVAr, b.ShuntMW, b.ShuntMVAr):
			return fail("bus %d: demand and shunt must be finite numbers", b.ID)
		case !positive(b.VMinPU) || !positive(b.VMaxPU) || b.VMinPU > b.VMaxPU:
			return fail("bus %d: voltage limits %g to %g; need 0 < vmin_pu <= vmax_pu", b.ID, b.VMinPU, b.VMaxPU)
		}
		seen[b.ID] = true
		if b.Kind != isolatedBus {
			live++
		}
	}
	if live == 0 {
		return fail("no bus that is not isolated; list at least one")
	}
	for k, l := range n.Branches {
		switch {
		case !seen[l.From] || !seen[l.To]:
			return fail("branch %d: ends at bus %d or %d, which is not listed", k+1, l.From, l.To)
		case l.From == l.To:
			return fail("branch %d: both ends at bus %d; leave it out", k+1, l.From)
		case !finite(l.ResistancePU, l.ReactancePU, l.ChargingPU, l.RatingMVA, l.Tap, l.ShiftDeg, l.AngleMinDeg, l.AngleMaxDeg):
			return fail("branch %d: all numbers must be finite", k+1)
		case l.ResistancePU == 0 && l.ReactancePU == 0:
			return fail("branch %d: no impedance between bus %d and %d; merge the buses", k+1, l.From, l.To)
		case l.RatingMVA < 0 || l.Tap < 0:
			return fail("branch %d: rating_mva and tap must not be negative", k+1)
		case l.AngleMinDeg > l.AngleMaxDeg:
			return fail("branch %d: angle limits %g to %g degrees leave nothing", k+1, l.AngleMinDeg, l.AngleMaxDeg)
		}
	}
	for k, g := range n.Generators {
		switch {
		case !seen[g.Bus]:
			return fail("generator %d: at bus %d, which is not listed", k+1, g.Bus)
		case math.IsNaN(g.PMinMW+g.PMaxMW+g.QMinMVAr+g.QMaxMVAr) || g.PMinMW > g.PMaxMW || g.QMinMVAr > g.QMaxMVAr:
			return fail("generator %d at bus %d: limits must be numbers, lower not above upper", k+1, g.Bus)
		case len(g.CostPerH) > 3:
			return fail("generator %d at bus %d: cost of degree %d; degree 2 is the highest taken", k+1, g.Bus, len(g.CostPerH)-1)
		case !finite(g.CostPerH...):
			return fail("generator %d at bus %d: cost_per_h must be finite numbers", k+1, g.Bus)
		case len(g.CostPerH) == 3 && g.CostPerH[2] < 0:
			return fail("generator %d at bus %d: cost falls ever faster with power (quadratic term %g); it must be convex", k+1, g.Bus, g.CostPerH[2])
		}
	}
	return nil
}

func positive(x float64) bool { return x > 0 && !math.IsInf(x, 1) }

func finite(xs ...float64) bool {
	for _, x := range xs {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return false
		}
	}
	return true
}
