package capability_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	. "towpath/capability"
	"towpath/model"
)

// randomLoad draws items over all kinds, of all magnitudes.
func randomLoad(r *rand.Rand) Load {
	var l Load
	for range 1 + r.IntN(6) {
		k := Kind{Place(r.IntN(2)), model.Field(r.IntN(4)), model.ConeKind(r.IntN(8))}
		l = append(l, Demand{Kind: k, Size: 1 + r.IntN(1<<r.IntN(16)), Count: 1 + r.IntN(1<<r.IntN(16))})
	}
	return l
}

// TestInteriorTollRises adds items, makes them larger and more, under random rates: the planner's bounds rest on it.
func TestInteriorTollRises(t *testing.T) {
	for seed := range uint64(5000) {
		r := rand.New(rand.NewPCG(seed, 3))
		some := func() float64 { return float64(r.IntN(3)) * math.Exp(r.NormFloat64()) }
		rates := Rates{
			Start: some(), Coefficient: some(), Iterations: some(), Flops: 1 + some(), Matrix: some(), ComplexCore: r.IntN(2) == 0,
			Scalar: some(), Product: some(), Entry: some(), Pair: some(), Bytes: some(), Copies: some(), Matrices: some(),
		}
		small := randomLoad(r)
		large := slices.Clone(small)
		k := r.IntN(len(large))
		switch r.IntN(3) {
		case 0:
			large[k].Size += 1 + r.IntN(10)
		case 1:
			large[k].Count += 1 + r.IntN(10)
		case 2:
			large = append(large, randomLoad(r)...)
		}
		a, b := InteriorToll(small, rates), InteriorToll(large, rates)
		if !(a.Seconds <= b.Seconds*(1+1e-14)) || !(a.Bytes <= b.Bytes*(1+1e-14)) || a.Seconds < 0 {
			t.Fatalf("seed %d: %v takes %v, more than %v with %v; rates %+v", seed, small, a, large, b, rates)
		}
	}
}

// TestInteriorTollMounts puts random loads together.
func TestInteriorTollMounts(t *testing.T) {
	for seed := range uint64(5000) {
		r := rand.New(rand.NewPCG(seed, 4))
		some := func() float64 { return float64(r.IntN(3)) * math.Exp(r.NormFloat64()) }
		rates := Rates{
			Start: some(), Coefficient: some(), Iterations: some(), Flops: 1 + some(), Matrix: some(), ComplexCore: r.IntN(2) == 0,
			Scalar: some(), Product: some(), Entry: some(), Pair: some(),
		}
		a, b := randomLoad(r), randomLoad(r)
		together := InteriorToll(slices.Concat(a, b), rates).Seconds + InteriorToll(nil, rates).Seconds
		if apart := InteriorToll(a, rates).Seconds + InteriorToll(b, rates).Seconds; together < apart*(1-1e-12) {
			t.Fatalf("seed %d: %v and %v take %v together and %v apart; rates %+v", seed, a, b, together, apart, rates)
		}
	}
}

// TestInteriorTollOfHermitian checks the count of flops by hand: 8 flops per complex multiplication and addition against 2
// per real one make a Hermitian matrix of order n half as dear as a symmetric one of order 2n.
func TestInteriorTollOfHermitian(t *testing.T) {
	rates := Rates{Iterations: 1, Flops: 1, Matrix: 2, Matrices: 1}
	one := func(f model.Field, n int) Toll {
		return InteriorToll(Load{{Kind: Kind{OnBlock, f, model.PSD}, Size: n, Count: 1}}, rates)
	}
	if got, want := one(model.Hermitian, 5).Seconds, 8.0*5*5*5; got != want {
		t.Errorf("Hermitian of order 5: %v flops, want %v", got, want)
	}
	if got, want := one(model.Symmetric, 10).Seconds, 2.0*10*10*10; got != want {
		t.Errorf("symmetric of order 10: %v flops, want %v", got, want)
	}
	if got, want := one(model.Hermitian, 5).Bytes, 16.0*5*5; got != want {
		t.Errorf("Hermitian of order 5: %v bytes, want %v", got, want)
	}
}

// TestInteriorTollOfRows checks the order of the reduced system: 3 complex rows are 6 real ones, a Hermitian equality
// of order 4 is 16, a symmetric free block of order 4 is 10.
func TestInteriorTollOfRows(t *testing.T) {
	rates := Rates{Iterations: 3, Flops: 2, Copies: 1}
	for _, x := range []struct {
		demand   Demand
		unknowns float64
	}{
		{Demand{Kind: Kind{OnMap, model.Complex, model.Zero}, Size: 1, Count: 3}, 6},
		{Demand{Kind: Kind{OnMap, model.Hermitian, model.Zero}, Size: 4, Count: 1}, 16},
		{Demand{Kind: Kind{OnBlock, model.Symmetric, model.Free}, Size: 4, Count: 1}, 10},
	} {
		got := InteriorToll(Load{x.demand}, rates)
		m := x.unknowns
		if want := 3 * (m * m * m / 3) / 2; math.Abs(got.Seconds-want) > 1e-12*want || got.Bytes != 8*m*m {
			t.Errorf("%s: %v, want %v seconds and %v bytes", x.demand, got, want, 8*m*m)
		}
	}
}

// TestInteriorTollStaysFinite asks for more than there is in the world.
func TestInteriorTollStaysFinite(t *testing.T) {
	var l Load
	for f := range 4 {
		for c := range 8 {
			l = append(l, Demand{Kind: Kind{OnMap, model.Field(f), model.ConeKind(c)}, Size: math.MaxInt, Count: math.MaxInt})
		}
	}
	if got := InteriorToll(l, testRates); math.IsInf(got.Seconds, 0) || math.IsNaN(got.Seconds) || math.IsInf(got.Bytes, 0) {
		t.Errorf("%v", got)
	}
}
