package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// hermitianFree writes a free Hermitian block as its real diagonal and its complex lower triangle, entry by entry.
// Toll: none, the entries stay as many.
type hermitianFree struct{ rule }

func newHermitianFree() Bridge {
	return hermitianFree{rule{"hermitian-free/triangle", blockKind(model.Hermitian, model.Free), "definition of Hermitian matrices"}}
}

func (hermitianFree) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, model.Free), n).and(blockKind(model.Complex, model.Free), n*(n-1)/2), true
}

func (hermitianFree) Lower(it Item) Lowering {
	n := it.Block.Rows
	t := newTable()
	diagonal, below := 0, n
	for k := range it.Block.Entries() {
		if i, j := model.PackedAt(n, k); i == j {
			t.row(diagonal, 1)
			diagonal++
		} else {
			t.row(below, 1)
			below++
		}
	}
	low := Lowering{Blocks: []model.Block{realBlock(n, model.Free)}, Values: t.combination()}
	if n > 1 {
		low.Blocks = append(low.Blocks, model.Block{Field: model.Complex, Rows: below - n, Cols: 1})
	}
	return low
}
