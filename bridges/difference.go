package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// difference writes a free real number as the difference of two nonnegative ones, x = p - q.
// Toll: two columns for one, and no unique solution: only for back ends that have no free columns.
type difference struct{ rule }

func newDifference() Bridge {
	return difference{rule{"free/difference", blockKind(model.Real, model.Free), "every number is a difference of two nonnegative ones"}}
}

func (difference) LastResort() bool { return true }

func (difference) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, model.Nonneg), 2*n), true
}

func (difference) Lower(it Item) Lowering {
	n := it.Block.Entries()
	t := newTable()
	for j := range n {
		t.add(j, 1)
		t.row(n+j, -1)
	}
	return Lowering{Blocks: []model.Block{realBlock(n, model.Nonneg), realBlock(n, model.Nonneg)}, Values: t.combination()}
}
