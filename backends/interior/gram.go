package interior

import (
	"slices"

	"towpath/backends/internal/dense"
)

// triplet is an entry of a Hermitian matrix in its lower triangle, row i >= column j.
type triplet struct {
	i, j int
	v    complex128
}

// pattern is the data of one psd item as sparse matrices, densest first.
type pattern struct {
	keys     []int
	matrices [][]triplet
	rows     [][]int // that have entries, the matrix taken as a whole
	after    []int   // entries of this matrix and of all after it
}

// newPattern turns the coordinates of an item back into entries.
func newPattern(it *item, c *psd) *pattern {
	entry := make([]triplet, 0, c.dim())
	const h = 0.70710678118654752440
	for j := range c.n {
		entry = append(entry, triplet{j, j, 1})
		for i := j + 1; i < c.n; i++ {
			entry = append(entry, triplet{i, j, h})
			if c.hermitian {
				entry = append(entry, triplet{i, j, complex(0, h)})
			}
		}
	}
	p := &pattern{}
	order := make([]int, len(it.keys))
	for k := range order {
		order[k] = k
	}
	slices.SortStableFunc(order, func(a, b int) int { return len(it.data[b].at) - len(it.data[a].at) })
	for _, k := range order {
		p.keys = append(p.keys, it.keys[k])
		var m []triplet
		used := make([]bool, c.n)
		for s, at := range it.data[k].at { // real and imaginary part of an entry follow each other
			e := entry[at]
			e.v *= complex(it.data[k].v[s], 0)
			used[e.i], used[e.j] = true, true
			if n := len(m) - 1; n >= 0 && m[n].i == e.i && m[n].j == e.j {
				m[n].v += e.v
				continue
			}
			m = append(m, e)
		}
		var rows []int
		for i, u := range used {
			if u {
				rows = append(rows, i)
			}
		}
		p.matrices, p.rows = append(p.matrices, m), append(p.rows, rows)
	}
	p.after = make([]int, len(p.keys)+1)
	for k := len(p.keys) - 1; k >= 0; k-- {
		p.after[k] = p.after[k+1] + len(p.matrices[k])
	}
	return p
}

// gramPSD adds sign <A_k, W A_l W> for all pairs. For every k it takes the cheaper of two formulas: W A_k W as a whole and its
// entries where A_l has some, or those entries alone from the entries of A_k (K. Fujisawa, M. Kojima, K. Nakata, Exploiting
// sparsity in primal-dual interior-point methods for semidefinite programming, 1997, formulas F1 and F3; from memory).
func (s *kkt) gramPSD(it *item, c *psd, sign float64) {
	p := s.patterns[it]
	if p == nil {
		p = newPattern(it, c)
		s.patterns[it] = p
	}
	w := c.w
	if !it.isBlock {
		w = c.wi
	}
	n := c.n
	t, u := c.t1, c.t2
	for k, a := range p.matrices {
		whole := n*n*len(p.rows[k]) + 2*len(a)*n
		const perPair = 3 // an entry from entries costs two products each, and jumps about
		if perPair*len(a)*p.after[k] <= whole {
			for l := k; l < len(p.keys); l++ {
				s.addPair(p.keys[k], p.keys[l], sign*pairing(n, w, a, p.matrices[l]))
			}
			continue
		}
		sandwich(n, u, t, w, a, p.rows[k])
		for l := k; l < len(p.keys); l++ {
			sum := 0.0
			for _, e := range p.matrices[l] {
				x := u[e.i*n+e.j]
				v := real(e.v)*real(x) + imag(e.v)*imag(x)
				if e.i != e.j {
					v *= 2
				}
				sum += v
			}
			s.addPair(p.keys[k], p.keys[l], sign*sum)
		}
	}
}

func (s *kkt) addPair(k, l int, v float64) {
	s.add(max(k, l), min(k, l), v)
}

// pairing is <B, W A W>, entry by entry.
func pairing(n int, w []complex128, a, b []triplet) float64 {
	sum := 0.0
	for _, e := range b {
		var x complex128 // of W A W in row e.i, column e.j
		left, right := w[e.i*n:e.i*n+n], w[e.j*n:e.j*n+n]
		for _, f := range a {
			// W is Hermitian, so column e.j is the conjugate of row e.j.
			x += left[f.i] * f.v * conj(right[f.j])
			if f.i != f.j {
				x += left[f.j] * conj(f.v) * conj(right[f.i])
			}
		}
		v := real(e.v)*real(x) + imag(e.v)*imag(x)
		if e.i != e.j {
			v *= 2
		}
		sum += v
	}
	return sum
}

// sandwich sets u = W A W, through t = A W of which only some rows are not zero.
func sandwich(n int, u, t, w []complex128, a []triplet, rows []int) {
	clear(t)
	for _, e := range a {
		axpy(t[e.i*n:e.i*n+n], e.v, w[e.j*n:e.j*n+n])
		if e.i != e.j {
			axpy(t[e.j*n:e.j*n+n], conj(e.v), w[e.i*n:e.i*n+n])
		}
	}
	if 3*len(rows) > n {
		dense.Mul(n, u, w, t)
		return
	}
	clear(u)
	for i := range n {
		for _, r := range rows {
			axpy(u[i*n:i*n+i+1], w[i*n+r], t[r*n:r*n+i+1]) // the lower triangle is enough
		}
	}
}

func axpy(y []complex128, a complex128, x []complex128) {
	for i, v := range x {
		y[i] += a * v
	}
}

func conj(z complex128) complex128 { return complex(real(z), -imag(z)) }
