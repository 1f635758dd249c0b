package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// complexTail writes lorentz cones with complex tails as real ones:
//
//	t >= ||z||         when  t >= ||(Re z, Im z)||
//	2 u v >= ||z||^2   when  2 u v >= ||(Re z, Im z)||^2
//
// The tail's multiplier comes back as y_Re + i y_Im, the heads' as they are.
// Toll: twice the tail.
type complexTail struct {
	rule
	heads int
}

func newComplexLorentz() Bridge {
	return complexTail{rule{"complex-lorentz/real-parts", mapKind(model.Complex, model.Lorentz), "definition of the 2-norm"}, 1}
}

func newComplexRotatedLorentz() Bridge {
	return complexTail{rule{"complex-rotated-lorentz/real-parts", mapKind(model.Complex, model.RotatedLorentz), "definition of the 2-norm"}, 2}
}

func (b complexTail) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, b.from.Cone), 2*n-b.heads), n >= b.heads
}

func (b complexTail) Lower(it Item) Lowering {
	t := newTable()
	for j := range it.Rows {
		t.row(j, takeRe)
		if j >= b.heads {
			t.row(j, takeIm)
		}
	}
	return Lowering{Constraints: []Image{image(model.Real, b.from.Cone, t.combination())}}
}
