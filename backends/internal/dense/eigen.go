package dense

import "math"

// Eigen finds the eigenvalues w, in no order, and the eigenvectors, columns of z, of the Hermitian a, which is
// destroyed. With z nil only the values are found. ok is false when the iteration does not end, as for NaN.
//
// Householder reduction to a real tridiagonal matrix, then implicit QL: G. H. Golub and C. F. Van Loan, Matrix
// Computations, 4th edition, section 8.3 (from memory).
func Eigen(n int, a []complex128, w []float64, z []complex128) (ok bool) {
	e := make([]float64, n)
	tau := make([]complex128, n)
	v := make([]complex128, n*n) // row c: the reflector that clears column c
	p := make([]complex128, n)
	for c := 0; c < n-1; c++ {
		w[c] = real(a[c*n+c])
		vc := v[c*n : c*n+n]
		tail := 0.0
		for r := c + 2; r < n; r++ {
			tail = math.Hypot(tail, math.Hypot(real(a[r*n+c]), imag(a[r*n+c])))
		}
		head := a[(c+1)*n+c]
		vc[c+1] = 1
		if tail == 0 && imag(head) == 0 {
			e[c] = real(head)
			continue
		}
		beta := -math.Copysign(math.Hypot(math.Hypot(real(head), imag(head)), tail), real(head))
		tau[c] = complex((beta-real(head))/beta, -imag(head)/beta)
		f := 1 / (head - complex(beta, 0))
		for r := c + 2; r < n; r++ {
			vc[r] = a[r*n+c] * f
		}
		e[c] = beta
		// a -= v p^H + p v^H with p = tau a v - 1/2 tau (p^H v) v
		var dot complex128
		for r := c + 1; r < n; r++ {
			var s complex128
			for k, x := range a[r*n+c+1 : r*n+n] {
				s += x * vc[c+1+k]
			}
			p[r] = tau[c] * s
			dot += conj(p[r]) * vc[r]
		}
		g := -0.5 * tau[c] * dot
		for r := c + 1; r < n; r++ {
			p[r] += g * vc[r]
		}
		for r := c + 1; r < n; r++ {
			row := a[r*n : r*n+n]
			for k := c + 1; k < n; k++ {
				row[k] -= vc[r]*conj(p[k]) + p[r]*conj(vc[k])
			}
		}
	}
	w[n-1] = real(a[n*n-1])
	if z == nil {
		return tridiagonal(n, w, e, nil)
	}
	zt := make([]float64, n*n)
	for i := range n {
		zt[i*n+i] = 1
	}
	if !tridiagonal(n, w, e, zt) {
		return false
	}
	for i := range n {
		for j := range n {
			z[i*n+j] = complex(zt[j*n+i], 0)
		}
	}
	for c := n - 2; c >= 0; c-- { // z = (I - tau v v^H) z
		if tau[c] == 0 {
			continue
		}
		vc := v[c*n : c*n+n]
		clear(p)
		for r := c + 1; r < n; r++ {
			x := conj(vc[r])
			for j, y := range z[r*n : r*n+n] {
				p[j] += x * y
			}
		}
		for r := c + 1; r < n; r++ {
			x := tau[c] * vc[r]
			zr := z[r*n : r*n+n]
			for j := range zr {
				zr[j] -= x * p[j]
			}
		}
	}
	return true
}

// tridiagonal finds the eigenvalues, in d, of the real symmetric matrix with diagonal d and off-diagonal e, which is
// destroyed, and turns the rows of zt, if not nil, along.
func tridiagonal(n int, d, e, zt []float64) (ok bool) {
	const (
		eps        = 0x1p-52
		iterations = 80 // per eigenvalue; 2 or 3 are usual
	)
	for l := range n {
		for iter := 0; ; iter++ {
			m := l
			for m < n-1 && !(math.Abs(e[m]) <= eps*(math.Abs(d[m])+math.Abs(d[m+1]))) {
				m++
			}
			if m == l {
				break
			}
			if iter == iterations {
				return false
			}
			g := (d[l+1] - d[l]) / (2 * e[l])
			r := math.Hypot(g, 1)
			g = d[m] - d[l] + e[l]/(g+math.Copysign(r, g))
			s, c, p := 1.0, 1.0, 0.0
			i := m - 1
			for ; i >= l; i-- {
				f, b := s*e[i], c*e[i]
				r = math.Hypot(f, g)
				e[i+1] = r
				if r == 0 { // deflate
					d[i+1] -= p
					e[m] = 0
					break
				}
				s, c = f/r, g/r
				g = d[i+1] - p
				r = (d[i]-g)*s + 2*c*b
				p = s * r
				d[i+1] = g + p
				g = c*r - b
				if zt != nil {
					turn(zt[(i+1)*n:(i+2)*n], zt[i*n:(i+1)*n], c, s)
				}
			}
			if r == 0 && i >= l {
				continue
			}
			d[l] -= p
			e[l] = g
			e[m] = 0
		}
	}
	return true
}

// turn rotates two rows.
func turn(hi, lo []float64, c, s float64) {
	for k, x := range hi {
		y := lo[k]
		hi[k] = s*y + c*x
		lo[k] = c*y - s*x
	}
}
