package interior

// orthant is the cone of nonnegative vectors.
type orthant struct {
	n int
	h []float64 // P / Q
	p []float64
	q []float64
}

func (c *orthant) dim() int        { return c.n }
func (c *orthant) degree() float64 { return float64(c.n) }

func (c *orthant) unit(v []float64) {
	for i := range v {
		v[i] = 1
	}
}

func (c *orthant) scale(p, q []float64) bool {
	c.p, c.q, c.h = append(c.p[:0], p...), append(c.q[:0], q...), c.h[:0]
	for i := range p {
		if !(p[i] > 0 && q[i] > 0) {
			return false
		}
		c.h = append(c.h, p[i]/q[i])
	}
	return true
}

func (c *orthant) apply(dst, src []float64, inverse bool) {
	for i, h := range c.h {
		if inverse {
			dst[i] = src[i] / h
		} else {
			dst[i] = src[i] * h
		}
	}
}

func (c *orthant) corrector(dst []float64, mu float64, dp, dq []float64) {
	for i := range dst {
		r := mu
		if dp != nil {
			r -= dp[i] * dq[i]
		}
		dst[i] = r/c.q[i] - c.p[i]
	}
}

func (c *orthant) step(p, dp, q, dq []float64, limit float64) float64 {
	for i := range p {
		if dp[i] < 0 {
			limit = min(limit, -p[i]/dp[i])
		}
		if dq[i] < 0 {
			limit = min(limit, -q[i]/dq[i])
		}
	}
	return limit
}
