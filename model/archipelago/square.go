package archipelago

import (
	"math/cmplx"

	"towpath/model"
)

// square is a small square matrix by rows. The cases need a handful of products and one linear system; nothing here
// is on any hot path.
type square [][]complex128

func newSquare(n int) square {
	a := make(square, n)
	for i := range a {
		a[i] = make([]complex128, n)
	}
	return a
}

func (a square) times(x []complex128) []complex128 {
	y := make([]complex128, len(a))
	for i, row := range a {
		for j, z := range row {
			y[i] += z * x[j]
		}
	}
	return y
}

func (a square) product(b square) square {
	c := newSquare(len(a))
	for i := range a {
		for k := range a {
			for j := range a {
				c[i][j] += a[i][k] * b[k][j]
			}
		}
	}
	return c
}

// congruence returns A B A^H.
func (a square) congruence(b square) square {
	h := newSquare(len(a))
	for i := range a {
		for j := range a {
			h[i][j] = cmplx.Conj(a[j][i])
		}
	}
	return a.product(b).product(h)
}

func (a square) scaled(s float64) square {
	for _, row := range a {
		for j := range row {
			row[j] *= complex(s, 0)
		}
	}
	return a
}

// packed lists the lower triangle of a Hermitian matrix by columns.
func (a square) packed() []complex128 {
	n := len(a)
	p := make([]complex128, model.PackedLen(n))
	for k := range p {
		i, j := model.PackedAt(n, k)
		p[k] = a[i][j]
		if i == j {
			p[k] = complex(real(a[i][j]), 0)
		}
	}
	return p
}

// solve returns x with A x = b for a Hermitian positive definite A, by elimination without exchanges, which is stable
// for such matrices. A and b are overwritten.
func (a square) solve(b []complex128) []complex128 {
	n := len(a)
	for k := range n {
		for i := k + 1; i < n; i++ {
			f := a[i][k] / a[k][k]
			for j := k; j < n; j++ {
				a[i][j] -= f * a[k][j]
			}
			b[i] -= f * b[k]
		}
	}
	for i := n - 1; i >= 0; i-- {
		for j := i + 1; j < n; j++ {
			b[i] -= a[i][j] * b[j]
		}
		b[i] /= a[i][i]
	}
	return b
}
