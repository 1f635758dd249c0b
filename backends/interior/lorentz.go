package interior

import "math"

// lorentz is the cone t >= ||x||. Its scaling is W = eta V with V the hyperbolic rotation that belongs to the point w of
// w' J w = 1, J = diag(1, -1, ..., -1); H = W^2 = eta^2 (2 w w' - J) (Alizadeh and Goldfarb 2003, section 6, from memory).
type lorentz struct {
	n      int
	eta    float64
	w      []float64
	lambda []float64 // W Q = W^-1 P
	a, b   []float64
}

// newLorentz gives the cone of dimension n; without tail it is a half-line.
func newLorentz(n int) cone {
	if n == 1 {
		return &orthant{n: 1}
	}
	v := make([]float64, 4*n)
	return &lorentz{n: n, w: v[:n], lambda: v[n : 2*n], a: v[2*n : 3*n], b: v[3*n:]}
}

func (c *lorentz) dim() int        { return c.n }
func (c *lorentz) degree() float64 { return 1 }

func (c *lorentz) unit(v []float64) {
	clear(v)
	v[0] = 1
}

// determinant is x' J x, without cancellation of squares.
func determinant(x []float64) float64 {
	r := norm(x[1:])
	return (x[0] - r) * (x[0] + r)
}

func (c *lorentz) scale(p, q []float64) bool {
	dp, dq := determinant(p), determinant(q)
	if !(p[0] > 0 && q[0] > 0 && dp > 0 && dq > 0) {
		return false
	}
	sp, sq := math.Sqrt(dp), math.Sqrt(dq)
	// With p and q scaled to determinant 1: w = (p + J q) / sqrt(2 (1 + p'q)).
	gamma := math.Sqrt(2 * (1 + dot(p, q)/(sp*sq)))
	for i := 1; i < c.n; i++ {
		c.w[i] = (p[i]/sp - q[i]/sq) / gamma
	}
	r := norm(c.w[1:])
	c.w[0] = math.Sqrt(1 + r*r) // on the hyperboloid, whatever was rounded
	c.eta = math.Sqrt(sp / sq)
	c.half(c.lambda, q, false)
	return true
}

// half sets dst = W src, or W^-1 src.
func (c *lorentz) half(dst, src []float64, inverse bool) {
	s, eta := 1.0, c.eta
	if inverse {
		s, eta = -1, 1/c.eta
	}
	along := dot(c.w[1:], src[1:])
	f := s*src[0] + along/(1+c.w[0])
	for i := 1; i < c.n; i++ {
		dst[i] = eta * (src[i] + f*c.w[i])
	}
	dst[0] = eta * (c.w[0]*src[0] + s*along)
}

func (c *lorentz) apply(dst, src []float64, inverse bool) {
	s, e := 1.0, c.eta*c.eta
	if inverse { // eta^-2 (2 (Jw)(Jw)' - J)
		s, e = -1, 1/e
	}
	t := 2 * (c.w[0]*src[0] + s*dot(c.w[1:], src[1:]))
	for i := 1; i < c.n; i++ {
		dst[i] = e * (s*t*c.w[i] + src[i])
	}
	dst[0] = e * (t*c.w[0] - src[0])
}

// corrector solves lambda o u = mu e - lambda o lambda - (W^-1 dp) o (W dq) in the Jordan algebra
// x o y = (x'y, x0 y1 + y0 x1) and returns W u.
func (c *lorentz) corrector(dst []float64, mu float64, dp, dq []float64) {
	l, r := c.lambda, make([]float64, c.n)
	r[0] = mu - dot(l, l)
	for i := 1; i < c.n; i++ {
		r[i] = -2 * l[0] * l[i]
	}
	if dp != nil {
		c.half(c.a, dp, true)
		c.half(c.b, dq, false)
		r[0] -= dot(c.a, c.b)
		for i := 1; i < c.n; i++ {
			r[i] -= c.a[0]*c.b[i] + c.b[0]*c.a[i]
		}
	}
	u := c.a
	u[0] = (l[0]*r[0] - dot(l[1:], r[1:])) / determinant(l)
	for i := 1; i < c.n; i++ {
		u[i] = (r[i] - u[0]*l[i]) / l[0]
	}
	c.half(dst, u, false)
}

func (c *lorentz) step(p, dp, q, dq []float64, limit float64) float64 {
	return lorentzStep(q, dq, lorentzStep(p, dp, limit))
}

// lorentzStep finds the smallest positive root of the determinant of x + t d.
func lorentzStep(x, d []float64, limit float64) float64 {
	a, b, c := determinant(d), x[0]*d[0]-dot(x[1:], d[1:]), determinant(x)
	if disc := b*b - a*c; disc >= 0 { // a t^2 + 2 b t + c
		s := -(b + math.Copysign(math.Sqrt(disc), b))
		if a != 0 && s/a > 0 {
			limit = min(limit, s/a)
		}
		if s != 0 && c/s > 0 {
			limit = min(limit, c/s)
		}
	}
	if d[0] < 0 {
		limit = min(limit, -x[0]/d[0])
	}
	return limit
}
