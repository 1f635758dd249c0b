package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// symmetricFree writes a free symmetric block as the real vector of its packed entries.
// Toll: none, the entries stay as many.
type symmetricFree struct{ rule }

func newSymmetricFree() Bridge {
	return symmetricFree{rule{"symmetric-free/triangle", blockKind(model.Symmetric, model.Free), "definition of symmetric matrices"}}
}

func (symmetricFree) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, model.Free), model.PackedLen(n)), true
}

func (symmetricFree) Lower(it Item) Lowering {
	n := it.Block.Entries()
	return Lowering{Blocks: []model.Block{realBlock(n, model.Free)}, Values: identity(n, 1)}
}
