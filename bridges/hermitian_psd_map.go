package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// hermitianPSDMap writes a Hermitian map of order n as a symmetric one of order 2n:
//
//	T(F) = [[Re F, -Im F], [Im F, Re F]]
//
// A multiplier Z, in n x n quarters, comes back as the adjoint T^*(Z) = (Z11 + Z22) + i (Z21 - Z12); with Z = T(Y)/2 that is
// Y. Reading one quarter loses a factor of two.
// Toll: order 2n.
type hermitianPSDMap struct{ rule }

func newHermitianPSDMap() Bridge {
	return hermitianPSDMap{rule{"hermitian-psd-map/real-2n", mapKind(model.Hermitian, model.PSD), embedding}}
}

func (hermitianPSDMap) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Symmetric, model.PSD), 2*n), true
}

func (hermitianPSDMap) Lower(it Item) Lowering {
	n, _ := model.PackedOrder(it.Rows)
	t := newTable()
	for k := range model.PackedLen(2 * n) {
		i, j := model.PackedAt(2*n, k) // i >= j
		switch {
		case (i < n) == (j < n): // a quarter on the diagonal
			t.row(model.PackedIndex(n, i%n, j%n), takeRe)
		case i-n > j:
			t.row(model.PackedIndex(n, i-n, j), takeIm)
		case i-n < j: // Im F_ij = -Im F_ji
			t.row(model.PackedIndex(n, j, i-n), -takeIm)
		default: // the diagonal of Im F is zero
			t.end()
		}
	}
	return Lowering{Constraints: []Image{image(model.Symmetric, model.PSD, t.combination())}}
}
