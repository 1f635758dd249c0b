package bridges

import (
	"math"

	"towpath/capability"
	"towpath/model"
)

// rotation is the source of the bridges between lorentz and rotated lorentz cones.
const rotation = "F. Alizadeh and D. Goldfarb, Math. Program. 95 (2003), section 2 (from memory)"

// reflection is the map between (t, x) with t >= ||x|| and (u, v, w) with 2 u v >= ||w||^2:
//
//	t = (u + v)/sqrt2,  x1 = (u - v)/sqrt2,  the rest of x is w:  t^2 - x1^2 = 2 u v
//
// It is orthogonal and its own inverse, so values and multipliers come back by the same map.
// Toll: none.
func reflection(n int) *Combination {
	const h = math.Sqrt2 / 2
	t := newTable()
	t.add(0, h)
	t.row(1, h)
	t.add(0, h)
	t.row(1, -h)
	for j := 2; j < n; j++ {
		t.row(j, 1)
	}
	return t.combination()
}

// other is the cone on the other side of the reflection.
func other(c model.ConeKind) model.ConeKind {
	if c == model.Lorentz {
		return model.RotatedLorentz
	}
	return model.Lorentz
}

// rotateBlock reflects a real block of dimension 2 or more.
type rotateBlock struct{ rule }

func newRotateBlock(c model.ConeKind) Bridge {
	return rotateBlock{rule{c.String() + "-block/" + other(c).String(), blockKind(model.Real, c), rotation}}
}

func (b rotateBlock) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, other(b.from.Cone)), n), n >= 2
}

func (b rotateBlock) Lower(it Item) Lowering {
	n := it.Block.Entries()
	return Lowering{Blocks: []model.Block{realBlock(n, other(b.from.Cone))}, Values: reflection(n)}
}

// rotateMap reflects the rows of a real map of dimension 2 or more.
type rotateMap struct{ rule }

func newRotateMap(c model.ConeKind) Bridge {
	return rotateMap{rule{c.String() + "-map/" + other(c).String(), mapKind(model.Real, c), rotation}}
}

func (b rotateMap) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, other(b.from.Cone)), n), n >= 2
}

func (b rotateMap) Lower(it Item) Lowering {
	return Lowering{Constraints: []Image{image(model.Real, other(b.from.Cone), reflection(it.Rows))}}
}
