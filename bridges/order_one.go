package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// A positive semidefinite matrix of order 1 is a number at least zero; values and multipliers are the same numbers.
// Toll: a row in place of a matrix.
type orderOneBlock struct{ rule }

func newOrderOneBlock(f model.Field) Bridge {
	return orderOneBlock{rule{f.String() + "-psd-block/order-1", blockKind(f, model.PSD), "definition of positive semidefinite"}}
}

func (orderOneBlock) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, model.Nonneg), 1), n == 1
}

func (orderOneBlock) Lower(Item) Lowering {
	return Lowering{Blocks: []model.Block{realBlock(1, model.Nonneg)}, Values: identity(1, 1)}
}

// orderOneMap is the same for maps.
type orderOneMap struct{ rule }

func newOrderOneMap(f model.Field) Bridge {
	return orderOneMap{rule{f.String() + "-psd-map/order-1", mapKind(f, model.PSD), "definition of positive semidefinite"}}
}

func (orderOneMap) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Nonneg), 1), n == 1
}

func (orderOneMap) Lower(Item) Lowering {
	return Lowering{Constraints: []Image{image(model.Real, model.Nonneg, identity(1, 1))}}
}
