package check

import (
	"math"

	"towpath/model"
)

func size(c complex128) float64 { return math.Hypot(real(c), imag(c)) }

// norm is the norm of the inner product with the given weights.
func norm(v []complex128, weight func(int) float64) float64 {
	n := 0.0
	for k, x := range v {
		n = math.Hypot(n, size(x)*math.Sqrt(weight(k)))
	}
	return n
}

// weights of packed entries: 2 off the diagonal.
func weights(f model.Field, n int) func(int) float64 {
	if !f.IsMatrix() {
		return func(int) float64 { return 1 }
	}
	order, _ := model.PackedOrder(n)
	return func(k int) float64 {
		if i, j := model.PackedAt(order, k); i != j {
			return 2
		}
		return 1
	}
}

// distance returns how far v is from the cone (or from its dual): in the norm of the inner product, for psd in the
// spectral norm, that is the size of the most negative eigenvalue. eigenvalue is the smallest one for psd, else NaN.
// Range is not a cone; see fromLimits.
func distance(kind model.ConeKind, f model.Field, v []complex128, dual bool) (far, eigenvalue float64) {
	eigenvalue = math.NaN()
	switch kind {
	case model.Free, model.Zero:
		if dual == (kind == model.Free) { // the dual of everything is zero, the dual of zero everything
			far = norm(v, weights(f, len(v)))
		}
	case model.Nonneg:
		for _, x := range v {
			far = math.Hypot(far, min(0, real(x)))
		}
	case model.Lorentz:
		far = fromLorentz(real(v[0]), plain(v[1:]))
	case model.RotatedLorentz:
		u, w := real(v[0]), real(v[1])
		far = fromLorentz((u+w)/math.Sqrt2, math.Hypot((u-w)/math.Sqrt2, plain(v[2:])))
	case model.PSD:
		n, _ := model.PackedOrder(len(v))
		eigenvalue = smallestEigenvalue(n, v)
		far = max(0, -eigenvalue)
	}
	if math.IsNaN(far) {
		far = math.Inf(1)
	}
	return far, eigenvalue
}

func plain(v []complex128) float64 { return norm(v, func(int) float64 { return 1 }) }

// fromLorentz is the distance of a point with head t and a tail of norm r from the cone t >= r.
func fromLorentz(t, r float64) float64 {
	switch {
	case t >= r:
		return 0
	case -t >= r: // the apex is nearest
		return math.Hypot(t, r)
	}
	return (r - t) / math.Sqrt2
}

// fromLimits is the largest violation of limits.
func fromLimits(v, lower, upper []complex128, isReal func(int) bool) float64 {
	far := 0.0
	for k, x := range v {
		far = max(far, real(lower[k])-real(x), real(x)-real(upper[k]))
		if !isReal(k) {
			far = max(far, imag(lower[k])-imag(x), imag(x)-imag(upper[k]))
		}
	}
	return far
}

// pushOnNothing is the size of multipliers that belong to absent sides.
func pushOnNothing(y, lower, upper []complex128) float64 {
	far := 0.0
	part := func(v, lo, up float64) {
		if v > 0 && math.IsInf(lo, -1) || v < 0 && math.IsInf(up, 1) {
			far = math.Hypot(far, v)
		}
	}
	for k, v := range y {
		part(real(v), real(lower[k]), real(upper[k]))
		part(imag(v), imag(lower[k]), imag(upper[k]))
	}
	return far
}

// side returns the limit that a multiplier of one part pushes on; ok is false when there is none.
func side(y, lower, upper float64) (limit float64, ok bool) {
	switch {
	case y > 0:
		return lower, !math.IsInf(lower, 0)
	case y < 0:
		return upper, !math.IsInf(upper, 0)
	}
	return 0, false
}
