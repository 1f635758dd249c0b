package interior

import "math"

// cone is one self-dual cone in orthonormal real coordinates, with the Nesterov-Todd scaling of its current pair of
// primal P and dual Q: H maps dual directions to primal ones, and H Q = P (Nesterov and Todd 1997, from memory).
type cone interface {
	dim() int
	degree() float64
	unit(v []float64)
	// scale takes the scaling at (P, Q); ok is false when one of them is not inside.
	scale(p, q []float64) (ok bool)
	// apply sets dst = H src, or H^-1 src. dst must not be src.
	apply(dst, src []float64, inverse bool)
	// corrector sets dst to the right-hand side of dP + H dQ = dst that steers P o Q to mu, with the second-order term
	// of the affine direction (dp, dq); nil for none.
	corrector(dst []float64, mu float64, dp, dq []float64)
	// step returns the largest alpha <= limit for which P + alpha dP and Q + alpha dQ stay in the cone.
	step(p, dp, q, dq []float64, limit float64) float64
}

func dot(x, y []float64) float64 {
	var s float64
	for i, v := range x {
		s += v * y[i]
	}
	return s
}

// norm is the 2-norm, safe from overflow.
func norm(x []float64) float64 {
	m := 0.0
	for _, v := range x {
		m = max(m, math.Abs(v))
	}
	if m == 0 || math.IsInf(m, 0) || math.IsNaN(m) {
		return m
	}
	var s float64
	for _, v := range x {
		s += v / m * (v / m)
	}
	return m * math.Sqrt(s)
}

func negate(x []float64) {
	for i := range x {
		x[i] = -x[i]
	}
}
