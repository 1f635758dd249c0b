package capability

import "towpath/model"

// Place says what is constrained: a block, the rows of a map, or the bounds of a block.
type Place uint8

const (
	OnBlock Place = iota
	OnMap
	OnBounds
)

// String returns the first part of a kind's name.
func (p Place) String() string {
	switch p {
	case OnBlock:
		return "block"
	case OnMap:
		return "map"
	case OnBounds:
		return "bounds"
	}
	return "unknown-place"
}

// Kind is a node of the capability graph, written like map/complex/zero or block/hermitian/psd.
type Kind struct {
	Place Place
	Field model.Field
	Cone  model.ConeKind
}

// String returns the kind's name.
func (k Kind) String() string {
	return k.Place.String() + "/" + k.Field.String() + "/" + k.Cone.String()
}

// Separable reports whether rows (entries, sides) of the kind are independent of each other, so that demands of
// it are counted one by one: their size is 1 and their count the total over the model.
//
//	free real and complex blocks    one per entry
//	nonneg, real and complex zero   one per entry or row
//	range rows and bounds           one per finite side
//
// All other kinds have their own size: the order of a matrix, the dimension of a lorentz cone (its number of
// rows or entries).
func (k Kind) Separable() bool {
	switch k.Cone {
	case model.Nonneg, model.Range, model.Box:
		return true
	case model.Free, model.Zero:
		return !k.Field.IsMatrix()
	}
	return false
}

// Demand is one kind with its size, how many of it, and how many coefficients they have together.
type Demand struct {
	Kind     Kind
	Size     int
	Count    int
	Nonzeros int64
}
