package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// slackIn gives a map in a cone a block of its own:
//
//	F(x) in K  when  F(x) - s = 0, s in K
//
// The multiplier of the equalities is that of the map: stationarity in s says that it lies in the dual cone.
// Toll: the cone stays; its rows become equalities.
type slackIn struct{ rule }

func newSlackIn(f model.Field, c model.ConeKind) Bridge {
	return slackIn{rule{coneName(f, c) + "-map/slack-in", mapKind(f, c), "S. Boyd and L. Vandenberghe, Convex Optimization (2004), section 4.1.3 (from memory)"}}
}

// coneName names a cone for bridge ids: the field only where it says something.
func coneName(f model.Field, c model.ConeKind) string {
	if f == model.Real {
		return c.String()
	}
	return f.String() + "-" + c.String()
}

func (b slackIn) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(b.from.Field, b.from.Cone), n).and(mapKind(b.from.Field, model.Zero), n), true
}

func (b slackIn) Lower(it Item) Lowering {
	s := realBlock(it.Rows, b.from.Cone)
	if b.from.Field.IsMatrix() {
		order, _ := model.PackedOrder(it.Rows)
		s = matrixBlock(b.from.Field, order, b.from.Cone)
	}
	rows := image(b.from.Field, model.Zero, identity(it.Rows, 1))
	rows.New = identity(it.Rows, -1)
	return Lowering{Blocks: []model.Block{s}, Constraints: []Image{rows}}
}
