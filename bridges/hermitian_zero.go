package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// hermitianZero writes F = 0, F Hermitian, as n real equalities on the diagonal and n(n-1)/2 complex ones below it.
//
// An entry below the diagonal counts twice in <Y, F> = Re tr(Y F), so its multiplier comes back halved: Y_ij = y_ij / 2.
// Toll: none, n^2 real numbers stay n^2.
type hermitianZero struct{ rule }

func newHermitianZero() Bridge {
	return hermitianZero{rule{"hermitian-zero/triangle", mapKind(model.Hermitian, model.Zero), "definition of Hermitian matrices"}}
}

func (hermitianZero) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Zero), n).and(mapKind(model.Complex, model.Zero), n*(n-1)/2), true
}

func (hermitianZero) Lower(it Item) Lowering {
	n, _ := model.PackedOrder(it.Rows)
	diagonal, below := newTable(), newTable()
	for k := range it.Rows {
		if i, j := model.PackedAt(n, k); i == j {
			diagonal.row(k, 1)
		} else {
			below.row(k, 1)
		}
	}
	low := Lowering{Constraints: []Image{image(model.Real, model.Zero, diagonal.combination())}}
	if n > 1 {
		low.Constraints = append(low.Constraints, image(model.Complex, model.Zero, below.combination()))
	}
	return low
}
