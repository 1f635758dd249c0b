package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// boundRows writes the bounds of a block as limits on real rows, one row per entry, or part of a complex entry, that has
// a bound. Multipliers come back as y_Re + i y_Im; below the diagonal of a matrix halved, because such an entry counts
// twice in <z, x>.
// Toll: one row per bounded part.
type boundRows struct{ rule }

func newBoundRows(f model.Field) Bridge {
	return boundRows{rule{f.String() + "-bounds/rows", boundsKind(f), "definition of bounds"}}
}

func (boundRows) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Range), n), true
}

func (boundRows) Lower(it Item) Lowering {
	b := it.Block
	return Lowering{Constraints: []Image{limitRows(b.Entries(), b.Bounds.Lower, b.Bounds.Upper, b.RealEntry)}}
}
