package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// symmetricZero writes F = 0, F symmetric, as real equalities on the packed entries. Multipliers below the diagonal come
// back halved, because they count twice in <Y, F>.
// Toll: none.
type symmetricZero struct{ rule }

func newSymmetricZero() Bridge {
	return symmetricZero{rule{"symmetric-zero/triangle", mapKind(model.Symmetric, model.Zero), "definition of symmetric matrices"}}
}

func (symmetricZero) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Zero), model.PackedLen(n)), true
}

func (symmetricZero) Lower(it Item) Lowering {
	return Lowering{Constraints: []Image{image(model.Real, model.Zero, identity(it.Rows, 1))}}
}
