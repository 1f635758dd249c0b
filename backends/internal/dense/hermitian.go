// Package dense has the dense Hermitian kernels of the interior-point engine. Matrices are square and row-major: order n in
// n*n numbers. Products run on assembly kernels where the processor has them, everything else in plain Go.
package dense

import "math"

// mulGo is Mul in plain Go.
func mulGo(n int, c, a, b []complex128) {
	clear(c[:n*n])
	for i := range n {
		ci := c[i*n : i*n+n]
		for k := range n {
			x := a[i*n+k]
			if x == 0 {
				continue
			}
			for j, v := range b[k*n : k*n+n] {
				ci[j] += x * v
			}
		}
	}
}

// mulHGo is MulH in plain Go.
func mulHGo(n int, c, a, b []complex128) {
	for i := range n {
		ai := a[i*n : i*n+n]
		for j := range n {
			c[i*n+j] = product(ai, b[j*n:j*n+n])
		}
	}
}

// product returns sum_k x_k conj(y_k).
func product(x, y []complex128) complex128 {
	var re, im float64
	for k, v := range x {
		w := y[k]
		re += real(v)*real(w) + imag(v)*imag(w)
		im += imag(v)*real(w) - real(v)*imag(w)
	}
	return complex(re, im)
}

// Adjoint sets b = a^H. b must not be a.
func Adjoint(n int, b, a []complex128) {
	for i := range n {
		for j := range n {
			b[i*n+j] = conj(a[j*n+i])
		}
	}
}

func conj(c complex128) complex128 { return complex(real(c), -imag(c)) }

// Cholesky sets l to the lower factor of the Hermitian a = l l^H, of which the lower triangle is read. ok is false when a
// pivot is not positive. l may be a.
func Cholesky(n int, l, a []complex128) (ok bool) {
	for i := range n {
		li := l[i*n : i*n+n]
		for j := 0; j <= i; j++ {
			lj := l[j*n : j*n+n]
			x := a[i*n+j] - product(li[:j], lj[:j])
			if i > j {
				li[j] = x / complex(real(lj[j]), 0)
				continue
			}
			if !(real(x) > 0) {
				return false
			}
			li[i] = complex(math.Sqrt(real(x)), 0)
		}
		clear(li[i+1:])
	}
	return true
}

// InvertLower sets m to the inverse of the lower triangular l with a positive real diagonal. m must not be l.
func InvertLower(n int, m, l []complex128) {
	clear(m[:n*n])
	for i := range n {
		mi := m[i*n : i*n+n]
		for k := range i {
			x := l[i*n+k]
			if x == 0 {
				continue
			}
			for j, v := range m[k*n : k*n+k+1] {
				mi[j] -= x * v
			}
		}
		d := complex(1/real(l[i*n+i]), 0)
		for j := range i {
			mi[j] *= d
		}
		mi[i] = d
	}
}
