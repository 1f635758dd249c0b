package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// rangeSides writes limits on real rows as nonnegative rows, one per finite side:
//
//	lower <= f <= upper  when  f - lower >= 0 and upper - f >= 0
//
// The multiplier comes back as that of the lower side minus that of the upper side.
// Toll: a row per side.
type rangeSides struct{ rule }

func newRangeSides() Bridge {
	return rangeSides{rule{"range/sides", mapKind(model.Real, model.Range), "definition of a range"}}
}

func (rangeSides) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Nonneg), n), true
}

func (rangeSides) Lower(it Item) Lowering {
	t := newTable()
	var consts []complex128
	for j := range it.Rows {
		if lower := real(it.Cone.Lower[j]); isFinite(lower) {
			t.row(j, 1)
			consts = append(consts, complex(-lower, 0))
		}
		if upper := real(it.Cone.Upper[j]); isFinite(upper) {
			t.row(j, -1)
			consts = append(consts, complex(upper, 0))
		}
	}
	rows := image(model.Real, model.Nonneg, t.combination())
	rows.Const = consts
	return Lowering{Constraints: []Image{rows}}
}
