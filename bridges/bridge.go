// Package bridges holds the transformations between kinds, one file each, and the draft on which they act.
//
// A bridge says what one item (a block, a map, or the bounds of a block) becomes, as a linear combination of the old
// rows or of new entries. That is all it has to say: the draft applies the combination to the coefficients, and
// lifting applies the same combination to values and its adjoint, under the inner products of package model, to
// multipliers. A factor of two can therefore be lost in one place only, the formula.
package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// Bridge is one transformation. It is pure: no I/O, no clock, no state.
type Bridge interface {
	capability.Rule
	// Source cites the paper, book or theorem behind the formula.
	Source() string
	// Lower says what the item becomes. The item is of kind From, of a size that Yields accepts.
	Lower(item Item) Lowering
}

// Item describes one thing to be lowered. Coefficients stay in the draft.
type Item struct {
	Kind capability.Kind
	// Block is set for blocks and bounds: the block itself (its Bounds are set for bounds).
	Block *model.Block
	// Rows and Cone are set for maps: number of rows and the set they lie in.
	Rows int
	Cone model.Cone
}

// Combination is a sparse real-linear map: out_r = sum_j Lin[r,j] in_j + sum_j Conj[r,j] conj(in_j), with the real
// part taken where row r is real. Columns are local: 0 for the first row (entry) of the item, or for the first entry
// of the first new block.
type Combination struct {
	Lin  model.Matrix
	Conj *model.Matrix // nil when no conjugate is used
}

// Lowering is what an item becomes.
type Lowering struct {
	// Blocks are new blocks: in place of a lowered block, or beside a lowered map. They are unnamed and unbounded.
	Blocks []model.Block
	// Values gives, for a lowered block, each old entry as a combination of the new blocks' entries, which are
	// numbered through Blocks.
	Values *Combination
	// Constraints are new constraints: in place of a lowered map or of bounds, or beside a lowered block.
	Constraints []Image
}

// Image is one new constraint, every row of it the sum of
//
//	Of:    a combination of the old map's rows (maps), or of the block's entries (bounds); nil for blocks
//	New:   a combination of the new blocks' entries; nil when there are none
//	Const: a constant; nil means zero
type Image struct {
	Field model.Field
	Cone  model.Cone
	Rows  int
	Of    *Combination
	New   *Combination
	Const []complex128
}
