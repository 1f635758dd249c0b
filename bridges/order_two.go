package bridges

import (
	"math"

	"towpath/capability"
	"towpath/model"
)

// minors is the source of the bridges for matrices of order 2.
const minors = "Sylvester's criterion: R. A. Horn and C. R. Johnson, Matrix Analysis, theorem 7.2.5 (from memory)"

// parts returns how many real numbers an entry below the diagonal has.
func parts(f model.Field) int {
	if f.IsComplex() {
		return 2
	}
	return 1
}

// orderTwoBlock writes a positive semidefinite block of order 2 as a rotated lorentz one:
//
//	[[a, conj(z)], [z, d]]  with  a = u, d = v, z = (w1 + i w2)/sqrt2,  2 u v >= w1^2 + w2^2
//
// (w2 only for Hermitian blocks.) The map is an isometry: the entry z counts twice, |z|^2 + |z|^2 = w1^2 + w2^2.
// Toll: a cone of dimension 3 or 4 in place of a matrix.
type orderTwoBlock struct{ rule }

func newOrderTwoBlock(f model.Field) Bridge {
	return orderTwoBlock{rule{f.String() + "-psd-block/order-2", blockKind(f, model.PSD), minors}}
}

func (b orderTwoBlock) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, model.RotatedLorentz), 2+parts(b.from.Field)), n == 2
}

func (b orderTwoBlock) Lower(Item) Lowering {
	t := newTable()
	t.row(0, 1)
	t.add(2, math.Sqrt2/2)
	if b.from.Field.IsComplex() {
		t.add(3, 1i*math.Sqrt2/2)
	}
	t.end()
	t.row(1, 1)
	return Lowering{Blocks: []model.Block{realBlock(2+parts(b.from.Field), model.RotatedLorentz)}, Values: t.combination()}
}

// orderTwoMap writes a positive semidefinite map of order 2 as a rotated lorentz one:
//
//	u = F11, v = F22, w = sqrt2 (Re F21, Im F21)
//
// The multiplier of F21 comes back as (y1 + i y2)/sqrt2: the factor sqrt2 of w, halved because F21 counts twice.
type orderTwoMap struct{ rule }

func newOrderTwoMap(f model.Field) Bridge {
	return orderTwoMap{rule{f.String() + "-psd-map/order-2", mapKind(f, model.PSD), minors}}
}

func (b orderTwoMap) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.RotatedLorentz), 2+parts(b.from.Field)), n == 2
}

func (b orderTwoMap) Lower(Item) Lowering {
	t := newTable()
	t.row(0, 1)
	t.row(2, 1)
	t.row(1, math.Sqrt2*takeRe)
	if b.from.Field.IsComplex() {
		t.row(1, math.Sqrt2*takeIm)
	}
	return Lowering{Constraints: []Image{image(model.Real, model.RotatedLorentz, t.combination())}}
}
