package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// complexFree writes a complex block as two real ones:
//
//	z = a + i b
//
// Values come back by the same sum. Constraints keep their rows; a coefficient c on z becomes c on a and i c on b.
// Toll: twice the columns.
type complexFree struct{ rule }

func newComplexFree() Bridge {
	return complexFree{rule{"complex-free/real-parts", blockKind(model.Complex, model.Free), "definition of the complex numbers"}}
}

func (complexFree) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Real, model.Free), 2*n), true
}

func (complexFree) Lower(it Item) Lowering {
	n := it.Block.Entries()
	t := newTable()
	for j := range n {
		t.add(j, 1)
		t.row(n+j, 1i)
	}
	return Lowering{Blocks: []model.Block{realBlock(n, model.Free), realBlock(n, model.Free)}, Values: t.combination()}
}
