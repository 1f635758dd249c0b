package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// openOut takes the cone off a block and puts it on a map:
//
//	x in K  when  x free, I x in K
//
// The block's own multiplier is that of the new map; nobody stores it, stationarity gives it.
// Toll: the cone stays; its entries become free.
type openOut struct{ rule }

func newOpenOut(f model.Field, c model.ConeKind) Bridge {
	return openOut{rule{coneName(f, c) + "-block/open-out", blockKind(f, c), "definition of a cone constraint"}}
}

func (b openOut) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(b.from.Field, model.Free), n).and(mapKind(b.from.Field, b.from.Cone), n), true
}

func (b openOut) Lower(it Item) Lowering {
	n := it.Block.Entries()
	free := *it.Block
	free.Name, free.Cone = "", model.Free
	rows := Image{Field: b.from.Field, Cone: model.Cone{Kind: b.from.Cone}, Rows: n, New: identity(n, 1)}
	return Lowering{Blocks: []model.Block{free}, Values: identity(n, 1), Constraints: []Image{rows}}
}
