package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// equalityPair writes an equality as two inequalities:
//
//	f = 0  when  f >= 0 and -f >= 0
//
// The multiplier comes back as the difference of the two.
// Toll: two rows for one, and no interior: only for back ends that have no equalities.
type equalityPair struct{ rule }

func newEqualityPair() Bridge {
	return equalityPair{rule{"zero/pair", mapKind(model.Real, model.Zero), "definition of equality"}}
}

func (equalityPair) LastResort() bool { return true }

func (equalityPair) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Nonneg), 2*n), true
}

func (equalityPair) Lower(it Item) Lowering {
	t := newTable()
	for j := range it.Rows {
		t.row(j, 1)
		t.row(j, -1)
	}
	return Lowering{Constraints: []Image{image(model.Real, model.Nonneg, t.combination())}}
}
