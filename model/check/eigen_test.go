package check

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"towpath/model"
)

// pack lists the lower triangle by columns.
func pack(n int, at func(i, j int) complex128) []complex128 {
	v := make([]complex128, model.PackedLen(n))
	for k := range v {
		v[k] = at(model.PackedAt(n, k))
	}
	return v
}

func TestSmallestEigenvalueInClosedForm(t *testing.T) {
	for _, n := range []int{1, 2, 3, 7, 20, 60} {
		root := cmplx.Exp(complex(0, 2*math.Pi/float64(n)))
		for _, c := range []struct {
			name string
			at   func(i, j int) complex128
			want float64
		}{
			{"diagonal", func(i, j int) complex128 {
				if i == j {
					return complex(float64(i)-3.5, 0)
				}
				return 0
			}, -3.5},
			{ // shift + v v^H with |v_k| = 1: the shift, and shift + n
				"shifted rank one", func(i, j int) complex128 {
					x := cmplx.Pow(root, complex(float64(i*i-j*j), 0))
					if i == j {
						return x + 0.25
					}
					return x
				}, map[bool]float64{true: 1.25, false: 0.25}[n == 1]},
			{ // G. D. Smith, Numerical Solution of Partial Differential Equations, 1985, from memory: a + 2 |b| cos(k pi/(n+1))
				"tridiagonal Toeplitz", func(i, j int) complex128 {
					switch i - j {
					case 0:
						return 2
					case 1:
						return 0.6 - 0.8i
					}
					return 0
				}, 2 + 2*math.Cos(float64(n)*math.Pi/float64(n+1))},
		} {
			if got := smallestEigenvalue(n, pack(n, c.at)); math.Abs(got-c.want) > 1e-13*float64(10+n) {
				t.Errorf("%s of order %d: %.16g, want %.16g", c.name, n, got, c.want)
			}
		}
	}
}

// A 2 x 2 matrix has (a+b)/2 - sqrt(((a-b)/2)^2 + |c|^2), at any scale.
func TestSmallestEigenvalueOfOrderTwo(t *testing.T) {
	for _, scale := range []float64{1e-150, 1e-8, 1, 1e8, 1e150} {
		a, b, c := 2*scale, -1*scale, complex(3*scale, -4*scale)
		want := scale * (0.5 - math.Sqrt(1.5*1.5+25))
		if got := smallestEigenvalue(2, []complex128{complex(a, 0), c, complex(b, 0)}); math.Abs(got-want) > 1e-14*scale*10 {
			t.Errorf("scale %g: %.16g, want %.16g", scale, got, want)
		}
	}
}

// U D U^H with Householder's U has the eigenvalues of D, however far apart they are.
func TestSmallestEigenvalueUnderReflections(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	const n = 12
	a := make([][]complex128, n)
	for i := range a {
		a[i] = make([]complex128, n)
		a[i][i] = complex(math.Pow(10, float64(i%7)), 0)
	}
	a[5][5] = -0.125
	for range 4 {
		v, norm := make([]complex128, n), 0.0
		for i := range v {
			v[i] = complex(rng.NormFloat64(), rng.NormFloat64())
			norm += real(v[i])*real(v[i]) + imag(v[i])*imag(v[i])
		}
		h := func(i, j int) complex128 {
			x := -2 * v[i] * cmplx.Conj(v[j]) / complex(norm, 0)
			if i == j {
				x++
			}
			return x
		}
		multiply := func(left bool) {
			out := make([][]complex128, n)
			for i := range out {
				out[i] = make([]complex128, n)
				for j := range out[i] {
					for k := range n {
						if left {
							out[i][j] += h(i, k) * a[k][j]
						} else {
							out[i][j] += a[i][k] * h(k, j)
						}
					}
				}
			}
			a = out
		}
		multiply(true)
		multiply(false)
	}
	got := smallestEigenvalue(n, pack(n, func(i, j int) complex128 { return a[i][j] }))
	if math.Abs(got+0.125) > 1e-15*1e6*n {
		t.Errorf("%.16g, want -0.125", got)
	}
}

func TestEigenvalueOfNonsenseIsNaN(t *testing.T) {
	for _, bad := range []complex128{complex(math.NaN(), 0), complex(math.Inf(1), 0), complex(0, math.NaN())} {
		if got := smallestEigenvalue(3, []complex128{1, bad, 0, 1, 0, 1}); !math.IsNaN(got) {
			t.Errorf("with %v: %g", bad, got)
		}
	}
}

// Neumaier's own point: naive summation of 1, 1e100, 1, -1e100 gives 0, and so does Kahan's.
func TestSumsKeepWhatCancels(t *testing.T) {
	var s sum
	for _, x := range []float64{1, 1e100, 1, -1e100} {
		s.add(x)
	}
	if s.value() != 2 {
		t.Errorf("%g, want 2", s.value())
	}
}
