package interior

import (
	"math"

	"towpath/backends/internal/dense"
)

// psd is the cone of positive semidefinite matrices, complex to the core: Hermitian matrices have n^2 coordinates, real
// symmetric ones n(n+1)/2, in the order of the packed lower triangle, off-diagonal ones times sqrt2 so that the plain dot
// product is <A, B>. The scaling is H S = W S W with W = G G^H and G^-1 P G^-H = G^H Q G = D diagonal.
type psd struct {
	n         int
	hermitian bool
	d         []float64
	g, gi     []complex128 // G, G^-1
	gh        []complex128 // G^H
	w, wi     []complex128 // W, W^-1
	t1, t2    []complex128
	t3, t4    []complex128
}

// newPSD gives the cone of order n; order 1 is a half-line.
func newPSD(n int, hermitian bool) cone {
	if n == 1 {
		return &orthant{n: 1}
	}
	c := &psd{n: n, hermitian: hermitian, d: make([]float64, n)}
	all := make([]complex128, 9*n*n)
	for i, m := range []*[]complex128{&c.g, &c.gi, &c.gh, &c.w, &c.wi, &c.t1, &c.t2, &c.t3, &c.t4} {
		*m = all[i*n*n : (i+1)*n*n]
	}
	return c
}

func (c *psd) dim() int {
	if c.hermitian {
		return c.n * c.n
	}
	return c.n * (c.n + 1) / 2
}

func (c *psd) degree() float64 { return float64(c.n) }

func (c *psd) unit(v []float64) {
	eye := make([]complex128, c.n*c.n)
	for i := range c.n {
		eye[i*c.n+i] = 1
	}
	c.vector(v, eye)
}

// matrix writes coordinates as a full matrix.
func (c *psd) matrix(m []complex128, v []float64) {
	const h = math.Sqrt2 / 2
	k, n := 0, c.n
	for j := range n {
		m[j*n+j] = complex(v[k], 0)
		k++
		for i := j + 1; i < n; i++ {
			x := complex(v[k]*h, 0)
			k++
			if c.hermitian {
				x += complex(0, v[k]*h)
				k++
			}
			m[i*n+j], m[j*n+i] = x, complex(real(x), -imag(x))
		}
	}
}

// vector takes the coordinates of the Hermitian part of a full matrix.
func (c *psd) vector(v []float64, m []complex128) {
	const h = math.Sqrt2 / 2
	k, n := 0, c.n
	for j := range n {
		v[k] = real(m[j*n+j])
		k++
		for i := j + 1; i < n; i++ {
			a, b := m[i*n+j], m[j*n+i]
			v[k] = (real(a) + real(b)) * h
			k++
			if c.hermitian {
				v[k] = (imag(a) - imag(b)) * h
				k++
			}
		}
	}
}

// scale factors P = L L^H and L^H Q L = V D^2 V^H, which gives G = L V D^-1/2. The eigenvalues D^2 are those of P Q, all
// of the size of mu near the central path, so that squaring costs no digits.
func (c *psd) scale(p, q []float64) bool {
	n := c.n
	l, li := make([]complex128, n*n), c.t4
	c.matrix(c.t1, p)
	if !dense.Cholesky(n, l, c.t1) {
		return false
	}
	c.matrix(c.t1, q)
	if !dense.Cholesky(n, c.t2, c.t1) {
		return false
	}
	dense.Mul(n, c.t2, c.t1, l)
	dense.Adjoint(n, c.t1, l)
	dense.Mul(n, c.t3, c.t1, c.t2)
	v := c.t2
	if !dense.Eigen(n, c.t3, c.d, v) {
		return false
	}
	for i := range c.d {
		if !(c.d[i] > 0) {
			return false
		}
		c.d[i] = math.Sqrt(c.d[i])
	}
	dense.Mul(n, c.g, l, v)
	dense.InvertLower(n, li, l)
	dense.Adjoint(n, c.t1, v)
	dense.Mul(n, c.gi, c.t1, li)
	for i := range n {
		for j := range n {
			c.g[i*n+j] *= complex(1/math.Sqrt(c.d[j]), 0)
			c.gi[i*n+j] *= complex(math.Sqrt(c.d[i]), 0)
		}
	}
	dense.Adjoint(n, c.gh, c.g)
	dense.MulH(n, c.w, c.g, c.g)
	dense.Adjoint(n, c.t1, c.gi)
	dense.Mul(n, c.wi, c.t1, c.gi)
	return true
}

// congruence sets dst = a m a^H.
func (c *psd) congruence(dst, a, m []complex128) {
	dense.Mul(c.n, c.t4, a, m)
	dense.MulH(c.n, dst, c.t4, a)
}

func (c *psd) apply(dst, src []float64, inverse bool) {
	w := c.w
	if inverse {
		w = c.wi
	}
	c.matrix(c.t1, src)
	c.congruence(c.t2, w, c.t1)
	c.vector(dst, c.t2)
}

// corrector solves (D u + u D)/2 = mu I - D^2 - (dp~ dq~ + dq~ dp~)/2, dp~ = G^-1 dp G^-H, dq~ = G^H dq G, and returns
// G u G^H.
func (c *psd) corrector(dst []float64, mu float64, dp, dq []float64) {
	n := c.n
	clear(c.t3)
	if dp != nil {
		c.matrix(c.t1, dp)
		c.congruence(c.t2, c.gi, c.t1)
		c.matrix(c.t3, dq)
		c.congruence(c.t1, c.gh, c.t3)
		dense.Mul(n, c.t3, c.t2, c.t1)
	}
	for i := range n {
		for j := 0; j <= i; j++ {
			a, b := c.t3[i*n+j], c.t3[j*n+i]
			r := -0.5 * (a + complex(real(b), -imag(b)))
			if i == j {
				r += complex(mu-c.d[i]*c.d[i], 0)
			}
			r *= complex(2/(c.d[i]+c.d[j]), 0)
			c.t2[i*n+j], c.t2[j*n+i] = r, complex(real(r), -imag(r))
		}
	}
	c.congruence(c.t1, c.g, c.t2)
	c.vector(dst, c.t1)
}

// step uses that P + alpha dP is inside as long as I + alpha D^-1/2 dp~ D^-1/2 is, and likewise for Q.
func (c *psd) step(p, dp, q, dq []float64, limit float64) float64 {
	n := c.n
	w := make([]float64, n)
	one := func(direction []float64, into []complex128) {
		c.matrix(c.t1, direction)
		c.congruence(c.t2, into, c.t1)
		for i := range n {
			for j := range n {
				c.t2[i*n+j] *= complex(1/math.Sqrt(c.d[i]*c.d[j]), 0)
			}
		}
		if !dense.Eigen(n, c.t2, w, nil) {
			limit = 0
			return
		}
		for _, v := range w {
			if v < 0 {
				limit = min(limit, -1/v)
			}
		}
	}
	one(dp, c.gi)
	one(dq, c.gh)
	return limit
}
