package dense

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"
)

// sizes around the corners.
var sizes = []int{1, 2, 3, 4, 7, 16, 33, 64}

func random(r *rand.Rand, n int) []complex128 {
	a := make([]complex128, n*n)
	for i := range a {
		a[i] = complex(r.NormFloat64(), r.NormFloat64())
	}
	return a
}

// near fails the test unless a and b agree to a few units in the last place of their size.
func near(t *testing.T, what string, n int, a, b []complex128) {
	t.Helper()
	size, far := 1.0, 0.0
	for i := range a {
		size = max(size, cmplx.Abs(b[i]))
		far = max(far, cmplx.Abs(a[i]-b[i]))
	}
	if !(far <= 1e-14*float64(n+10)*size) {
		t.Errorf("%s, order %d: off by %.2g of %.2g", what, n, far, size)
	}
}

func TestCholeskyAndInverse(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for _, n := range sizes {
		b := random(r, n)
		a, l, back := make([]complex128, n*n), make([]complex128, n*n), make([]complex128, n*n)
		MulH(n, a, b, b)
		for i := range n {
			a[i*n+i] += complex(float64(n), 0)
		}
		if !Cholesky(n, l, a) {
			t.Fatalf("order %d: a positive definite matrix was refused", n)
		}
		MulH(n, back, l, l)
		near(t, "l l^H", n, back, a)
		m, eye := make([]complex128, n*n), make([]complex128, n*n)
		InvertLower(n, m, l)
		Mul(n, back, m, l)
		for i := range n {
			eye[i*n+i] = 1
		}
		near(t, "l^-1 l", n, back, eye)
		Adjoint(n, back, l)
		Adjoint(n, m, back)
		near(t, "(l^H)^H", n, m, l)
	}
}

func TestCholeskyRefusesIndefinite(t *testing.T) {
	a := []complex128{1, 2i, -2i, 1}
	if Cholesky(2, make([]complex128, 4), a) {
		t.Error("eigenvalues -1 and 3 were called positive")
	}
	if Cholesky(1, make([]complex128, 1), []complex128{complex(math.NaN(), 0)}) {
		t.Error("NaN was called positive")
	}
}

func TestEigenRebuilds(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	for _, n := range sizes {
		b := random(r, n)
		a := make([]complex128, n*n)
		for i := range n {
			for j := range n {
				a[i*n+j] = b[i*n+j] + conj(b[j*n+i])
			}
		}
		keep := slices.Clone(a)
		w, z := make([]float64, n), make([]complex128, n*n)
		if !Eigen(n, a, w, z) {
			t.Fatalf("order %d: no end", n)
		}
		az, zw, zz, eye := make([]complex128, n*n), make([]complex128, n*n), make([]complex128, n*n), make([]complex128, n*n)
		Mul(n, az, keep, z)
		for i := range n {
			eye[i*n+i] = 1
			for j := range n {
				zw[i*n+j] = z[i*n+j] * complex(w[j], 0)
			}
		}
		near(t, "a z - z w", n, az, zw)
		MulH(n, zz, z, z)
		near(t, "z z^H", n, zz, eye)
		alone := make([]float64, n)
		copy(a, keep)
		if !Eigen(n, a, alone, nil) {
			t.Fatalf("order %d: no end", n)
		}
		slices.Sort(w)
		slices.Sort(alone)
		for i := range w {
			if math.Abs(w[i]-alone[i]) > 1e-13*float64(n)*(1+math.Abs(w[i])) {
				t.Errorf("order %d: eigenvalue %d is %g with vectors, %g without", n, i, w[i], alone[i])
			}
		}
	}
}

func TestEigenEndsOnNaN(t *testing.T) {
	a := []complex128{1, complex(math.NaN(), 0), complex(math.NaN(), 0), 1}
	if Eigen(2, a, make([]float64, 2), nil) {
		t.Error("NaN has no eigenvalues")
	}
}
