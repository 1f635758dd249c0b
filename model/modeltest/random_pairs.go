package modeltest

import (
	"math"

	"towpath/model"
)

// number is a random number, complex when asked.
func (g *garden) number(isComplex bool) complex128 {
	if isComplex {
		return complex(g.rng.NormFloat64(), g.rng.NormFloat64())
	}
	return complex(g.rng.NormFloat64(), 0)
}

// sides draws which of two opposite elements is away from zero: the first, the second, or, in degenerate models,
// neither.
func (g *garden) sides() (first, second float64) {
	size := 0.5 + g.rng.Float64()
	switch draw := g.rng.IntN(6); {
	case draw == 0 && g.Degenerate:
		return 0, 0
	case draw%2 == 0:
		return size, 0
	}
	return 0, size
}

// pair draws f in the cone of c and y in its dual cone with <f, y> = 0. Range cones get limits that suit f.
func (g *garden) pair(c *model.Constraint) (f, y []complex128) {
	n := c.Map.Rows()
	f, y = make([]complex128, n), make([]complex128, n)
	free := func(v []complex128) {
		for r := range v {
			v[r] = g.number(!c.RealRow(r))
		}
	}
	switch c.Cone.Kind {
	case model.Free:
		free(f)
	case model.Zero:
		free(y)
	case model.Nonneg:
		for r := range f {
			a, b := g.sides()
			f[r], y[r] = complex(a, 0), complex(b, 0)
		}
	case model.Range:
		free(f)
		g.limits(c, f, y)
	case model.Lorentz:
		g.lorentz(c, f, y)
	case model.RotatedLorentz:
		g.rotated(c, f, y)
	case model.PSD:
		g.psd(c, f, y)
	}
	return f, y
}

// limits chooses the limits of rows at f, and the multipliers that go with them.
func (g *garden) limits(c *model.Constraint, f, y []complex128) {
	n := len(f)
	c.Cone.Lower, c.Cone.Upper = make([]complex128, n), make([]complex128, n)
	for r := range f {
		lo, up, m := g.interval(real(f[r]))
		var ilo, iup, im float64
		if !c.RealRow(r) {
			ilo, iup, im = g.interval(imag(f[r]))
		}
		c.Cone.Lower[r], c.Cone.Upper[r], y[r] = complex(lo, ilo), complex(up, iup), complex(m, im)
	}
}

// interval draws limits that hold x, tight on one side, on both or on none, and the multiplier of lower minus upper.
func (g *garden) interval(x float64) (lower, upper, multiplier float64) {
	inf := math.Inf(1)
	a, b := 0.5+g.rng.Float64(), 0.5+g.rng.Float64()
	kind := g.rng.IntN(6)
	if g.Degenerate && g.rng.IntN(4) == 0 {
		a = 0
	}
	switch kind {
	case 0:
		return x, x + b, a
	case 1:
		return x - b, x, -a
	case 2:
		return x - a, x + b, 0
	case 3:
		return x, inf, a
	case 4:
		return -inf, x, -a
	}
	return x, x, a - b
}

// lorentz draws one of: f inside and y zero, the reverse, or both on opposite rays of the boundary.
func (g *garden) lorentz(c *model.Constraint, f, y []complex128) {
	norm := 0.0
	for r := 1; r < len(f); r++ {
		f[r] = g.number(!c.RealRow(r))
		norm = math.Hypot(norm, math.Hypot(real(f[r]), imag(f[r])))
	}
	switch g.rng.IntN(4) {
	case 0:
		f[0] = complex(norm+0.5, 0)
	case 1:
		copy(y, f)
		clear(f)
		y[0] = complex(norm+0.5, 0)
	default:
		f[0] = complex(norm, 0)
		y[0] = 1.5 * f[0]
		for r := 1; r < len(f); r++ {
			y[r] = -1.5 * f[r]
		}
	}
}

// rotated is lorentz for 2 u v >= ||w||^2: (u, v, w) and (v, u, -w) are opposite on the boundary.
func (g *garden) rotated(c *model.Constraint, f, y []complex128) {
	norm2 := 0.0
	for r := 2; r < len(f); r++ {
		f[r] = g.number(!c.RealRow(r))
		norm2 += real(f[r])*real(f[r]) + imag(f[r])*imag(f[r])
	}
	u := 0.5 + g.rng.Float64()
	f[0], f[1] = complex(u, 0), complex(norm2/(2*u), 0)
	switch g.rng.IntN(4) {
	case 0:
		f[1] += 0.5
	case 1:
		copy(y, f)
		clear(f)
		y[1] += 0.5
	default:
		y[0], y[1] = 0.7*f[1], 0.7*f[0]
		for r := 2; r < len(f); r++ {
			y[r] = -0.7 * f[r]
		}
	}
}

// psd draws a common orthonormal basis and shares it out between f and y.
func (g *garden) psd(c *model.Constraint, f, y []complex128) {
	n, _ := model.PackedOrder(len(f))
	var basis [][]complex128
	for len(basis) < n { // Gram and Schmidt; random vectors of such orders are safely independent
		v := make([]complex128, n)
		for i := range v {
			v[i] = g.number(c.Map.Field == model.Hermitian)
		}
		for range 2 {
			for _, q := range basis {
				var dot complex128
				for i := range v {
					dot += conj(q[i]) * v[i]
				}
				for i := range v {
					v[i] -= dot * q[i]
				}
			}
		}
		norm := 0.0
		for _, z := range v {
			norm = math.Hypot(norm, math.Hypot(real(z), imag(z)))
		}
		for i := range v {
			v[i] /= complex(norm, 0)
		}
		basis = append(basis, v)
		a, b := g.sides()
		for k := range f {
			i, j := model.PackedAt(n, k)
			p := v[i] * conj(v[j])
			if i == j {
				p = complex(real(p), 0)
			}
			f[k] += complex(a, 0) * p
			y[k] += complex(b, 0) * p
		}
	}
}
