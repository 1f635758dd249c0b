package dense

import (
	"math/rand/v2"
	"testing"
)

// Every kernel that this processor runs, at every order around the edges of its tiles and of the packing, against plain Go.
func TestKernels(t *testing.T) {
	all := kernels()
	if len(all) == 0 {
		t.Log("this processor has none of the assembly kernels: plain Go is all there is to test")
	}
	r := rand.New(rand.NewPCG(8, 9))
	orders := []int{63, 64, 65, 127, 191, 192, 193, 200, 385}
	for n := 1; n <= 40; n++ {
		orders = append(orders, n)
	}
	for _, k := range all {
		for _, n := range orders {
			a, b := random(r, n), random(r, n)
			got, want := random(r, n), make([]complex128, n*n) // what was in the result must not matter
			k.multiply(n, got, a, b, false)
			mulGo(n, want, a, b)
			near(t, k.name+" a b", n, got, want)
			k.multiply(n, got, a, b, true)
			mulHGo(n, want, a, b)
			near(t, k.name+" a b^H", n, got, want)
		}
	}
}

// The same product twice is the same to the last bit, whatever ran in between.
func TestProductsRepeat(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 3))
	const n = 50
	a, b := random(r, n), random(r, n)
	first, again, other := make([]complex128, n*n), make([]complex128, n*n), make([]complex128, 70*70)
	Mul(n, first, a, b)
	Mul(70, other, random(r, 70), random(r, 70))
	Mul(n, again, a, b)
	for i := range first {
		if first[i] != again[i] {
			t.Fatalf("number %d: %v, then %v", i, first[i], again[i])
		}
	}
}
