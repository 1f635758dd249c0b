package check

import (
	"math"
	"math/rand/v2"
	"testing"

	"towpath/model"
)

func TestDistanceInClosedForm(t *testing.T) {
	const r2 = math.Sqrt2
	for _, c := range []struct {
		name  string
		kind  model.ConeKind
		field model.Field
		v     []complex128
		dual  bool
		want  float64
	}{
		{"free", model.Free, model.Complex, []complex128{3 + 4i}, false, 0},
		{"dual of free", model.Free, model.Complex, []complex128{3 + 4i}, true, 5},
		{"dual of free, off the diagonal twice", model.Free, model.Hermitian, []complex128{1, 1 + 1i, 2}, true, 3},
		{"zero", model.Zero, model.Complex, []complex128{3 + 4i, 12i}, false, 13},
		{"dual of zero", model.Zero, model.Complex, []complex128{3 + 4i}, true, 0},
		{"zero, symmetric", model.Zero, model.Symmetric, []complex128{3, r2 * 2, 0}, false, 5},
		{"nonneg inside", model.Nonneg, model.Real, []complex128{0, 2}, false, 0},
		{"nonneg", model.Nonneg, model.Real, []complex128{-3, 2, -4}, false, 5},
		{"lorentz inside", model.Lorentz, model.Complex, []complex128{5, 3i, 4}, false, 0},
		{"lorentz boundary is nearest", model.Lorentz, model.Complex, []complex128{1, 3i, 4}, false, 4 / r2},
		{"lorentz apex is nearest", model.Lorentz, model.Real, []complex128{-12, 3, 4}, false, 13},
		{"lorentz of dimension 1", model.Lorentz, model.Real, []complex128{-2}, false, 2},
		{"rotated inside: 2 u v = |w|^2", model.RotatedLorentz, model.Complex, []complex128{1, 2, 1 + 1i, r2}, false, 0},
		{"rotated, at w alone", model.RotatedLorentz, model.Complex, []complex128{0, 0, 2i}, false, r2},
		{"rotated, u negative", model.RotatedLorentz, model.Real, []complex128{-3, 0}, false, 3},
		{"psd inside: both eigenvalues of [[2, i], [-i, 1/2]] are 0 and 2.5", model.PSD, model.Hermitian, []complex128{2, 1i, 0.5}, false, 0},
		{"psd: [[0, 2i], [-2i, 0]] has -2", model.PSD, model.Hermitian, []complex128{0, 2i, 0}, false, 2},
		{"psd, symmetric: [[1, 3], [3, 1]] has -2", model.PSD, model.Symmetric, []complex128{1, 3, 1}, false, 2},
		{"NaN is infinitely far", model.Nonneg, model.Real, []complex128{complex(math.NaN(), 0)}, false, math.Inf(1)},
	} {
		got, _ := distance(c.kind, c.field, c.v, c.dual)
		if got != c.want && !(math.Abs(got-c.want) <= 1e-14*(1+c.want)) {
			t.Errorf("%s: %.16g, want %.16g", c.name, got, c.want)
		}
	}
}

// Moreau: the distance of v from a self-dual cone is the norm of the projection of -v on it, so that for lorentz cones the
// squares of the distances of v and of -v add up to |v|^2.
func TestDistancesOfOppositesAddUp(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 4))
	for range 200 {
		v, minus := make([]complex128, 5), make([]complex128, 5)
		for k := range v {
			v[k] = complex(rng.NormFloat64(), 0)
			if k > 1 {
				v[k] += complex(0, rng.NormFloat64())
			}
			minus[k] = -v[k]
		}
		for _, kind := range []model.ConeKind{model.Lorentz, model.RotatedLorentz} {
			if kind == model.Lorentz {
				v[1], minus[1] = v[1]+1i, minus[1]-1i
			} else {
				v[1], minus[1] = complex(real(v[1]), 0), complex(real(minus[1]), 0)
			}
			a, _ := distance(kind, model.Complex, v, false)
			b, _ := distance(kind, model.Complex, minus, false)
			if size := plain(v); math.Abs(math.Hypot(a, b)-size) > 1e-13*size {
				t.Errorf("%s: %g and %g for a vector of size %g", kind, a, b, size)
			}
		}
	}
}

func TestLimits(t *testing.T) {
	inf := math.Inf(1)
	lower, upper := []complex128{complex(1, -inf), complex(-inf, 2)}, []complex128{complex(4, 3), complex(0, 2)}
	someReal := func(k int) bool { return false }
	for _, c := range []struct {
		v    []complex128
		want float64
	}{
		{[]complex128{complex(2, -50), complex(-9, 2)}, 0},
		{[]complex128{complex(0.5, 0), complex(-9, 2)}, 0.5},
		{[]complex128{complex(2, 4), complex(3, 2)}, 3},
		{[]complex128{complex(2, 0), complex(0, 1.25)}, 0.75},
	} {
		if got := fromLimits(c.v, lower, upper, someReal); got != c.want {
			t.Errorf("%v: %g, want %g", c.v, got, c.want)
		}
	}
	// Multipliers may push only on sides that are there: Im of the first below, Re of the second below.
	if got := pushOnNothing([]complex128{complex(7, 3), complex(4, -1)}, lower, upper); got != 5 {
		t.Errorf("pushes on absent sides: %g, want 5", got)
	}
}
