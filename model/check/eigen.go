package check

import "math"

// smallestEigenvalue returns the smallest eigenvalue of the Hermitian matrix of order n whose packed lower triangle is
// given: Householder reduction to a real tridiagonal matrix (Golub and Van Loan, Matrix Computations, section 8.3), then
// bisection on Sturm counts (Barth, Martin and Wilkinson 1967); both from memory, both backward stable. NaN in, NaN out.
func smallestEigenvalue(n int, packed []complex128) float64 {
	if n == 1 {
		return real(packed[0])
	}
	a := make([]complex128, n*n)
	k := 0
	for j := range n {
		a[j*n+j] = complex(real(packed[k]), 0)
		k++
		for i := j + 1; i < n; i++ {
			a[i*n+j], a[j*n+i] = packed[k], conj(packed[k])
			k++
		}
	}
	d, e := tridiagonalise(n, a)
	lo, hi := math.Inf(1), math.Inf(-1)
	for i := range d { // Gershgorin's discs
		r := 0.0
		if i > 0 {
			r += e[i-1]
		}
		if i < n-1 {
			r += e[i]
		}
		lo, hi = min(lo, d[i]-r), max(hi, d[i]+r)
	}
	if math.IsNaN(lo-lo) || math.IsNaN(hi-hi) { // Inf - Inf is NaN, too
		return math.NaN()
	}
	for accuracy := 0x1p-51 * max(math.Abs(lo), math.Abs(hi)); hi-lo > accuracy; {
		mid := lo + (hi-lo)/2
		if mid <= lo || mid >= hi {
			break
		}
		if below(d, e, mid) > 0 {
			hi = mid
		} else {
			lo = mid
		}
	}
	return lo + (hi-lo)/2
}

func conj(c complex128) complex128 { return complex(real(c), -imag(c)) }

// below counts the eigenvalues below x by the signs of the pivots of the shifted matrix.
func below(d, e []float64, x float64) int {
	const tiny = 1e-300 // stands for a pivot of zero
	count, q := 0, 1.0
	for i := range d {
		off := 0.0
		if i > 0 {
			off = e[i-1] * (e[i-1] / q)
		}
		if q = d[i] - x - off; q == 0 {
			q = tiny
		}
		if q < 0 {
			count++
		}
	}
	return count
}

// tridiagonalise reduces the Hermitian a, which is destroyed, to diagonal d and off-diagonal e >= 0; phases of
// off-diagonal entries do not change eigenvalues.
func tridiagonalise(n int, a []complex128) (d, e []float64) {
	d, e = make([]float64, n), make([]float64, n)
	v, p := make([]complex128, n), make([]complex128, n)
	for c := range n - 1 {
		d[c] = real(a[c*n+c])
		tail := 0.0
		for r := c + 2; r < n; r++ {
			tail = math.Hypot(tail, size(a[r*n+c]))
		}
		head := a[(c+1)*n+c]
		e[c] = math.Hypot(size(head), tail)
		if tail == 0 {
			continue
		}
		beta := -math.Copysign(e[c], real(head))
		tau := complex((beta-real(head))/beta, -imag(head)/beta)
		f := 1 / (head - complex(beta, 0))
		v[c+1] = 1
		for r := c + 2; r < n; r++ {
			v[r] = a[r*n+c] * f
		}
		var dot complex128
		for r := c + 1; r < n; r++ {
			var s complex128
			for k := c + 1; k < n; k++ {
				s += a[r*n+k] * v[k]
			}
			p[r] = tau * s
			dot += conj(p[r]) * v[r]
		}
		g := -0.5 * tau * dot
		for r := c + 1; r < n; r++ {
			p[r] += g * v[r]
		}
		for r := c + 1; r < n; r++ {
			row := a[r*n : r*n+n]
			for k := c + 1; k < n; k++ {
				row[k] -= v[r]*conj(p[k]) + p[r]*conj(v[k])
			}
		}
	}
	d[n-1] = real(a[n*n-1])
	return d, e
}
