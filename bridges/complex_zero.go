package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// complexZero writes complex equalities as real ones:
//
//	f = 0  when  Re f = 0 and Im f = Re(-i f) = 0
//
// The multiplier comes back as y = y_Re + i y_Im, because Re(conj(y) f) = y_Re Re f + y_Im Im f.
// Toll: twice the rows.
type complexZero struct{ rule }

func newComplexZero() Bridge {
	return complexZero{rule{"complex-zero/real-parts", mapKind(model.Complex, model.Zero), "definition of the complex numbers"}}
}

func (complexZero) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Zero), 2*n), true
}

func (complexZero) Lower(it Item) Lowering {
	t := newTable()
	for j := range it.Rows {
		t.row(j, takeRe)
		t.row(j, takeIm)
	}
	return Lowering{Constraints: []Image{image(model.Real, model.Zero, t.combination())}}
}
