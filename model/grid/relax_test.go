package grid_test

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"towpath/model"
	"towpath/model/grid"
)

// sample is a network with everything that the formulas know: parallel lines listed in both directions, a transformer
// with ratio and shift, shunts, an isolated bus, a line out of service, costs of degree 0 to 2.
func sample() *grid.Network {
	line := func(from, to int, r, x, b float64) grid.Branch {
		return grid.Branch{From: from, To: to, ResistancePU: r, ReactancePU: x, ChargingPU: b, RatingMVA: 90, InService: true, AngleMinDeg: -30, AngleMaxDeg: 25}
	}
	n := &grid.Network{
		Name: "sample", BaseMVA: 10,
		Buses: []grid.Bus{
			{ID: 7, Kind: 3, DemandMW: 3, DemandMVAr: 1, VMinPU: 0.9, VMaxPU: 1.1},
			{ID: 2, Kind: 1, DemandMW: 5, DemandMVAr: -1, ShuntMW: 0.3, ShuntMVAr: 2, VMinPU: 0.92, VMaxPU: 1.08},
			{ID: 5, Kind: 2, DemandMW: 1, DemandMVAr: 2, VMinPU: 0.95, VMaxPU: 1.05},
			{ID: 9, Kind: 4, DemandMW: 100, VMinPU: 0.9, VMaxPU: 1.1},
		},
		Branches: []grid.Branch{
			line(7, 2, 0.02, 0.11, 0.04),
			line(2, 7, 0.03, 0.2, 0.01),
			line(5, 2, 0.01, 0.08, 0.02),
			line(5, 7, 0, 0.3, 0),
			line(5, 9, 0.01, 0.1, 0),
			line(2, 5, 0.01, 0.1, 0),
		},
		Generators: []grid.Generator{
			{Bus: 7, PMinMW: 0, PMaxMW: 20, QMinMVAr: -9, QMaxMVAr: 9, InService: true, CostPerH: []float64{4, 2, 0.5}},
			{Bus: 5, PMinMW: 0, PMaxMW: 20, QMinMVAr: -9, QMaxMVAr: 9, InService: true, CostPerH: []float64{1, 3}},
			{Bus: 5, PMinMW: 0, PMaxMW: 20, QMinMVAr: -9, QMaxMVAr: 9, InService: false, CostPerH: []float64{1, 3}},
		},
	}
	n.Branches[3].Tap, n.Branches[3].ShiftDeg = 0.95, 12
	n.Branches[5].InService = false
	return n
}

// TestBalanceIsKirchhoffsLaw computes, for random voltages, what flows where from Ohm's law on every element, sets the
// demands so that they balance, and asks the built rows whether they agree.
func TestBalanceIsKirchhoffsLaw(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 1))
	for _, relaxation := range []grid.Relaxation{grid.SecondOrder, grid.Pairwise, grid.Semidefinite} {
		for range 20 {
			n := sample()
			v := map[int]complex128{}
			for _, b := range n.Buses {
				v[b.ID] = cmplx.Rect(b.VMinPU+rng.Float64()*(b.VMaxPU-b.VMinPU), 0.2*(rng.Float64()-0.5))
			}
			power := []complex128{complex(rng.Float64(), rng.Float64()), complex(rng.Float64(), rng.Float64())} // per unit
			leaving := map[int]complex128{}
			flows := map[string]float64{}
			for k, l := range n.Branches {
				if !l.InService || l.To == 9 {
					continue
				}
				ratio := cmplx.Rect(max(l.Tap, 0), l.ShiftDeg*math.Pi/180)
				if l.Tap == 0 {
					ratio = 1
				}
				// Behind the ideal transformer; power passes it unchanged.
				near := v[l.From] / ratio
				series := (near - v[l.To]) / complex(l.ResistancePU, l.ReactancePU)
				half := complex(0, l.ChargingPU/2)
				sent := near * cmplx.Conj(series+half*near)
				received := v[l.To] * cmplx.Conj(half*v[l.To]-series)
				leaving[l.From] += sent
				leaving[l.To] += received
				flows[name("rating of branch %d at bus %d", k+1, l.From)] = cmplx.Abs(sent)
				flows[name("rating of branch %d at bus %d", k+1, l.To)] = cmplx.Abs(received)
			}
			for i := range n.Buses[:3] {
				b := &n.Buses[i]
				// The current through a shunt admittance g + jb; ShuntMVAr is what b supplies at one per unit.
				admittance := complex(b.ShuntMW, b.ShuntMVAr) / complex(n.BaseMVA, 0)
				rest := -leaving[b.ID] - v[b.ID]*cmplx.Conj(admittance*v[b.ID])
				switch b.ID {
				case 7:
					rest += power[0]
				case 5:
					rest += power[1]
				}
				b.DemandMW, b.DemandMVAr = real(rest)*n.BaseMVA, imag(rest)*n.BaseMVA
			}
			m, err := grid.Relax(n, relaxation)
			if err != nil {
				t.Fatal(err)
			}
			if err := m.Validate(); err != nil {
				t.Fatalf("%v: %v", relaxation, err)
			}
			x := operatingPoint(t, m, n, v, power)
			balances, ratings := 0, 0
			for _, c := range m.Constraints {
				rows := evaluate(&c, x)
				switch {
				case strings.HasPrefix(c.Name, "power balance"):
					balances++
					if cmplx.Abs(rows[0]) > 1e-12 {
						t.Errorf("%v: %s off by %v", relaxation, c.Name, rows[0])
					}
				case strings.HasPrefix(c.Name, "rating"):
					ratings++
					if want := flows[c.Name]; math.Abs(cmplx.Abs(rows[1])-want) > 1e-12 || rows[0] != 9 {
						t.Errorf("%v: %s: flow %v of %v, want %v of 9", relaxation, c.Name, cmplx.Abs(rows[1]), rows[0], want)
					}
				case strings.HasPrefix(c.Name, "voltages"):
					// V V^H lies on the boundary of the cone.
					gap := real(2*rows[0]*rows[1]) - square(rows[2])
					if c.Cone.Kind == model.PSD {
						gap = real(rows[0]*rows[2]) - square(rows[1])
					}
					if math.Abs(gap) > 1e-12 {
						t.Errorf("%v: %s: V V^H is off the boundary by %v", relaxation, c.Name, gap)
					}
				case strings.HasPrefix(c.Name, "angle"):
					if real(rows[0]) < 0 || real(rows[1]) < 0 {
						t.Errorf("%v: %s refuses an angle within its limits: %v", relaxation, c.Name, rows)
					}
				case strings.HasPrefix(c.Name, "square of"):
					if s := real(2*rows[0]*rows[1]) - square(rows[2]); math.Abs(s) > 1e-12 {
						t.Errorf("%s is off the boundary by %v", c.Name, s)
					}
				}
			}
			if balances != 3 || ratings != 8 {
				t.Fatalf("%d balances and %d ratings, want 3 and 8", balances, ratings)
			}
			cost := m.Objective.Const
			for k, col := range m.Objective.Col {
				cost += real(m.Objective.Coef[k] * x[col])
			}
			p0, p1 := real(power[0])*10, real(power[1])*10
			if want := 4 + 2*p0 + 0.5*p0*p0 + 1 + 3*p1; math.Abs(cost-want) > 1e-9 {
				t.Errorf("cost %v, want %v", cost, want)
			}
		}
	}
}

func TestBoxHoldsEveryPointAndTouches(t *testing.T) {
	for _, limits := range [][2]float64{{-30, 25}, {5, 40}, {-50, -10}, {-70, 70}, {0, 0}} {
		n := sample()
		for k := range n.Branches {
			n.Branches[k].AngleMinDeg, n.Branches[k].AngleMaxDeg = limits[0], limits[1]
			if n.Branches[k].From == 2 {
				n.Branches[k].AngleMinDeg, n.Branches[k].AngleMaxDeg = -limits[1], -limits[0]
			}
		}
		m, err := grid.Relax(n, grid.SecondOrder)
		if err != nil {
			t.Fatal(err)
		}
		low, high := limits[0], limits[1]
		if low == 0 && high == 0 {
			low, high = -60, 60
		}
		low, high = max(low, -60)*math.Pi/180, min(high, 60)*math.Pi/180
		// First pair: buses 7 and 2, stored as W_2,7; the limits are of angle 7 minus angle 2.
		bounds := m.Blocks[1].Bounds
		lower, upper := complex(math.Inf(1), math.Inf(1)), complex(math.Inf(-1), math.Inf(-1))
		const steps = 400
		for k := range steps + 1 {
			a := low + (high-low)*float64(k)/steps
			for _, size := range []float64{0.9 * 0.92, 1.1 * 1.08} {
				w := cmplx.Rect(size, -a)
				lower = complex(min(real(lower), real(w)), min(imag(lower), imag(w)))
				upper = complex(max(real(upper), real(w)), max(imag(upper), imag(w)))
			}
		}
		if cmplx.Abs(lower-bounds.Lower[0]) > 1e-4 || cmplx.Abs(upper-bounds.Upper[0]) > 1e-4 {
			t.Errorf("angles %v: box %v to %v, points fill %v to %v", limits, bounds.Lower[0], bounds.Upper[0], lower, upper)
		}
	}
}

func TestTablesThatCannotBeUsed(t *testing.T) {
	for _, c := range []struct {
		spoil func(*grid.Network)
		says  string
	}{
		{func(n *grid.Network) { n.BaseMVA = 0 }, "base_mva"},
		{func(n *grid.Network) { n.Buses[1].ID = 7 }, "bus 7 is listed twice"},
		{func(n *grid.Network) { n.Buses[1].DemandMW = math.NaN() }, "bus 2: demand"},
		{func(n *grid.Network) { n.Buses[2].VMinPU = 1.2 }, "bus 5: voltage limits"},
		{func(n *grid.Network) { n.Buses = n.Buses[3:]; n.Branches = nil; n.Generators = nil }, "no bus"},
		{func(n *grid.Network) { n.Branches[0].To = 44 }, "branch 1: ends at bus 7 or 44"},
		{func(n *grid.Network) { n.Branches[1].To = 2 }, "branch 2: both ends at bus 2"},
		{func(n *grid.Network) { n.Branches[2].ResistancePU, n.Branches[2].ReactancePU = 0, 0 }, "branch 3: no impedance"},
		{func(n *grid.Network) { n.Branches[2].ReactancePU = math.Inf(1) }, "branch 3: all numbers must be finite"},
		{func(n *grid.Network) { n.Branches[2].RatingMVA = -1 }, "branch 3: rating_mva"},
		{func(n *grid.Network) { n.Branches[2].AngleMinDeg = 40 }, "branch 3: angle limits"},
		{func(n *grid.Network) { n.Branches[1].AngleMinDeg, n.Branches[1].AngleMaxDeg = 40, 50 }, "leave nothing within"},
		{func(n *grid.Network) { n.Generators[1].Bus = 3 }, "generator 2: at bus 3"},
		{func(n *grid.Network) { n.Generators[1].PMinMW = 30 }, "generator 2 at bus 5: limits"},
		{func(n *grid.Network) { n.Generators[1].CostPerH = []float64{0, 1, 2, 3} }, "generator 2 at bus 5: cost of degree 3"},
		{func(n *grid.Network) { n.Generators[1].CostPerH = []float64{0, 1, -2} }, "convex"},
		{func(n *grid.Network) { n.Generators[1].CostPerH = []float64{math.NaN()} }, "cost_per_h"},
	} {
		n := sample()
		c.spoil(n)
		_, err := grid.Relax(n, grid.SecondOrder)
		if err == nil || !strings.Contains(err.Error(), c.says) || !strings.Contains(err.Error(), `network "sample"`) {
			t.Errorf("want an error about %q, got %v", c.says, err)
		}
	}
	if _, err := grid.Relax(sample(), 9); err == nil {
		t.Error("an unknown relaxation was accepted")
	}
	if _, err := grid.Read(strings.NewReader(`{"name":"x","base_mva":1,"buses":[{"id":1,"vmin_pu":1,"vmax_pu":1,"demand":3}]}`)); err == nil {
		t.Error("a misspelt column was accepted")
	}
}

func TestEqualLimitsBecomeEqualities(t *testing.T) {
	n := sample()
	n.Generators[1].PMinMW, n.Generators[1].PMaxMW = 2, 2
	n.Generators[0].QMinMVAr, n.Generators[0].QMaxMVAr = -1, -1
	n.Buses[1].VMinPU, n.Buses[1].VMaxPU = 1.05, 1.05
	for _, relaxation := range []grid.Relaxation{grid.SecondOrder, grid.Semidefinite} {
		m, err := grid.Relax(n, relaxation)
		if err != nil {
			t.Fatal(err)
		}
		if err := m.Validate(); err != nil {
			t.Fatal(err)
		}
		x := make([]complex128, m.Starts()[len(m.Blocks)])
		found := map[string]complex128{}
		for _, c := range m.Constraints {
			if strings.Contains(c.Name, ", fixed at ") {
				found[c.Name] = -evaluate(&c, x)[0]
				if p := c.Map.Lin.Col; len(p) != 1 || c.Map.Lin.At(0) != 1 || c.Cone.Kind != model.Zero {
					t.Errorf("%s: %+v", c.Name, c)
				}
			}
		}
		voltage := grid.SquaredVoltage
		if relaxation == grid.Semidefinite {
			voltage = grid.VoltageProduct
		}
		for name, want := range map[string]float64{
			"active power, fixed at generator 2 at bus 5":   0.2,
			"reactive power, fixed at generator 1 at bus 7": -0.1,
			voltage + ", fixed at bus 2":                    1.05 * 1.05,
		} {
			if got, ok := found[name]; !ok || math.Abs(real(got)-want) > 1e-15 {
				t.Errorf("%v: %q is %v (there: %v), want %v", relaxation, name, got, ok, want)
			}
		}
		if len(found) != 3 {
			t.Errorf("%v: fixed %v", relaxation, found)
		}
	}
}
