package archipelago

import (
	"fmt"
	"math"
	"math/cmplx"

	"towpath/model"
	"towpath/model/internal/rows"
)

// phase of the response that the radar's receiver wants in the wanted direction. Any would do; one that is not real
// shows that multipliers come back with their phase.
var wanted = cmplx.Rect(1, 0.8)

// steering returns the phases with which a plane wave from the given bearing reaches elements at the given places, in
// wavelengths along the shore. Bearings are given by their sine, broadside being 0.
func steering(places []float64, sine float64) []complex128 {
	a := make([]complex128, len(places))
	for k, x := range places {
		a[k] = cmplx.Rect(1, 2*math.Pi*x*sine)
	}
	return a
}

// addResponse adds scale * a^H w, the response to a plane wave, to a row; weights start at the given entry.
func addResponse(r *rows.Rows, row, first int, a []complex128, scale float64) {
	for k, z := range a {
		r.Add(row, first+k, cmplx.Conj(z)*complex(scale, 0))
	}
}

// beam starts a model with a level to minimize and one complex weight per element, the response in the wanted
// direction being fixed.
func beam(name, level string, places []float64, sine float64) *model.Model {
	m := &model.Model{
		Name: name,
		Blocks: []model.Block{
			{Name: level, Field: model.Real, Rows: 1, Cols: 1},
			{Name: "weight", Field: model.Complex, Rows: len(places), Cols: 1},
		},
		Objective: model.Objective{Col: []uint32{0}, Coef: []complex128{1}},
	}
	r := rows.New(model.Complex, 1)
	addResponse(r, 0, 1, steering(places, sine), 1)
	r.Const(0, -wanted)
	m.Constraints = []model.Constraint{r.In(model.Zero, "response towards the wanted bearing")}
	return m
}

// sidelobes asks for weights of ten elements, half a wavelength apart, whose response outside the main lobe is as
// small as can be:
//
//	minimize t   subject to   a(wanted)^H w = exp(0.8 i),   |a(s)^H w| <= t   for every sidelobe bearing s
//
// With u the phase step between neighbours relative to the wanted direction, the best response is, up to a phase, the
// Chebyshev polynomial T_9(x0 cos(u/2)) / T_9(x0), x0 = 1/cos(edge/2): C. Dolph, "A current distribution for broadside
// arrays which optimizes the relationship between beam width and side-lobe level", Proc. IRE 34, 1946 (from memory).
// The bearings asked for contain the ten extrema of that polynomial, so the optimum over them is the same: 1/T_9(x0).
// The multiplier of the equality is the optimum times the phase, because the optimum scales with the wanted response.
func sidelobes() Case {
	const (
		elements = 10
		edge     = 0.9  // of the main lobe, in phase step
		sine     = 0.35 // wanted bearing, some 20 degrees off broadside
		between  = 3    // further bearings between two extrema
	)
	places := make([]float64, elements)
	for k := range places {
		places[k] = float64(k) / 2
	}
	m := beam("Lowest sidelobes of the coastal radar", "sidelobe level", places, sine)
	x0 := 1 / math.Cos(edge/2)
	extremum := func(k int) float64 { return 2 * math.Acos(math.Cos(float64(k)*math.Pi/(elements-1))/x0) }
	for k := range elements {
		steps := []float64{extremum(k)}
		for i := 1; i <= between && k+1 < elements; i++ {
			f := float64(i) / (between + 1)
			steps = append(steps, (1-f)*extremum(k)+f*extremum(k+1))
		}
		for _, u := range steps {
			s := sine + u/math.Pi // one step of u = 2 pi (1/2) (s - sine)
			if s > 1 {
				s -= 2 // at half a wavelength, bearings repeat after that
			}
			r := rows.New(model.Complex, 2)
			r.Add(0, 0, 1)
			addResponse(r, 1, 1, steering(places, s), 1)
			m.Constraints = append(m.Constraints, r.In(model.Lorentz, fmt.Sprintf("sidelobe at %+.2f degrees", math.Asin(s)*180/math.Pi)))
		}
	}
	level := 1 / math.Cosh((elements-1)*math.Acosh(x0))
	return Case{
		ID:    "sidelobes",
		Story: "The coastal radar looks 20 degrees off broadside and wants to hear as little as possible from everywhere else.",
		Model: m,
		Known: &Known{
			Source:      "Chebyshev array, Dolph 1946",
			Objective:   level,
			Multipliers: map[int][]complex128{0: {complex(level, 0) * wanted}},
		},
	}
}

// ferries asks for the weights of eight unevenly placed elements that receive one bearing undistorted and as little
// power as possible of receiver noise and two ferries' transmitters:
//
//	minimize t   subject to   a^H w = exp(0.8 i),   t >= || noise * w, sqrt(P_k) a_k^H w ||
//
// With R = noise^2 I + sum P_k a_k a_k^H the optimum is 1 / sqrt(a^H R^-1 a): J. Capon, "High-resolution
// frequency-wavenumber spectrum analysis", Proc. IEEE 57, 1969 (from memory). The multiplier of the equality is the
// optimum times the phase.
func ferries() Case {
	places := []float64{0, 0.45, 1.05, 1.4, 2.1, 2.45, 3.15, 3.5}
	const (
		noise = 0.3
		sine  = -0.2
	)
	disturbers := []struct{ sine, amplitude float64 }{{0.1, 3}, {0.62, 5}}
	m := beam("Receive past two ferries", "received amplitude", places, sine)
	n := len(places)
	power := rows.New(model.Complex, 1+n+len(disturbers))
	power.Add(0, 0, 1)
	r := newSquare(n)
	for k := range n {
		power.Add(1+k, 1+k, noise)
		r[k][k] = noise * noise
	}
	for i, d := range disturbers {
		a := steering(places, d.sine)
		addResponse(power, 1+n+i, 1, a, d.amplitude)
		for k := range n {
			for l := range n {
				r[k][l] += complex(d.amplitude*d.amplitude, 0) * a[k] * cmplx.Conj(a[l])
			}
		}
	}
	m.Constraints = append(m.Constraints, power.In(model.Lorentz, "received amplitude"))
	a := steering(places, sine)
	gain := 0.0
	for k, z := range r.solve(steering(places, sine)) {
		gain += real(cmplx.Conj(a[k]) * z)
	}
	least := 1 / math.Sqrt(gain)
	return Case{
		ID:    "ferries",
		Story: "Two ferries transmit while the radar listens for a buoy; the weights must not distort the buoy.",
		Model: m,
		Known: &Known{
			Source:      "minimum variance without distortion, Capon 1969",
			Objective:   least,
			Multipliers: map[int][]complex128{0: {complex(least, 0) * wanted}},
		},
	}
}
