package bridgetest

import (
	"math"
	"math/rand/v2"

	"towpath/model"
)

func number(rng *rand.Rand, isReal bool) complex128 {
	if isReal {
		return complex(rng.NormFloat64(), 0)
	}
	return complex(rng.NormFloat64(), rng.NormFloat64())
}

func randomPoint(rng *rand.Rand, m *model.Model) *model.Point {
	p := &model.Point{}
	for b := range m.Blocks {
		v := make([]complex128, m.Blocks[b].Entries())
		for k := range v {
			v[k] = number(rng, m.Blocks[b].RealEntry(k))
		}
		p.Values = append(p.Values, v)
	}
	return p
}

// near moves every entry by about the given step; real entries stay real.
func near(rng *rand.Rand, p *model.Point, step float64) *model.Point {
	out := &model.Point{}
	for _, values := range p.Values {
		v := make([]complex128, len(values))
		for k, x := range values {
			v[k] = x + complex(step, 0)*number(rng, imag(x) == 0)
		}
		out.Values = append(out.Values, v)
	}
	return out
}

func randomMultipliers(rng *rand.Rand, m *model.Model) *model.Multipliers {
	y := &model.Multipliers{Bounds: make([][]complex128, len(m.Blocks))}
	for k := range m.Constraints {
		c := &m.Constraints[k]
		v := make([]complex128, c.Map.Rows())
		for r := range v {
			v[r] = number(rng, c.RealRow(r))
		}
		y.Constraints = append(y.Constraints, v)
	}
	for b := range m.Blocks {
		if m.Blocks[b].Bounds != nil {
			y.Bounds[b] = make([]complex128, m.Blocks[b].Entries())
			for k := range y.Bounds[b] {
				y.Bounds[b][k] = number(rng, m.Blocks[b].RealEntry(k))
			}
		}
	}
	return y
}

func dot(a, b complex128) float64 { return real(a)*real(b) + imag(a)*imag(b) }

func close(a, b float64) bool { return math.Abs(a-b) <= rounding*(1+math.Abs(a)+math.Abs(b)) }
