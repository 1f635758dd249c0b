package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// rule is what the bridges of this catalogue have in common: they are exact and carry everything back.
type rule struct {
	id     string
	from   capability.Kind
	source string
}

func (r rule) ID() string                      { return r.id }
func (r rule) From() capability.Kind           { return r.from }
func (r rule) Source() string                  { return r.source }
func (r rule) Exactness() capability.Exactness { return capability.Exact }
func (r rule) Lifts() capability.Lifts         { return capability.LiftsAll }
func (r rule) LastResort() bool                { return false }

func blockKind(f model.Field, c model.ConeKind) capability.Kind {
	return capability.Kind{Place: capability.OnBlock, Field: f, Cone: c}
}

func mapKind(f model.Field, c model.ConeKind) capability.Kind {
	return capability.Kind{Place: capability.OnMap, Field: f, Cone: c}
}

func boundsKind(f model.Field) capability.Kind {
	return capability.Kind{Place: capability.OnBounds, Field: f, Cone: model.Box}
}

// sizes lists the parts of a size rule: n of a kind for separable kinds, one of size n for others.
type sizes []capability.Demand

func (s sizes) and(k capability.Kind, n int) sizes {
	switch {
	case n == 0:
		return s
	case k.Separable():
		return append(s, capability.Demand{Kind: k, Size: 1, Count: n})
	}
	return append(s, capability.Demand{Kind: k, Size: n, Count: 1})
}

func realBlock(n int, c model.ConeKind) model.Block {
	return model.Block{Field: model.Real, Rows: n, Cols: 1, Cone: c}
}

func matrixBlock(f model.Field, order int, c model.ConeKind) model.Block {
	return model.Block{Field: f, Rows: order, Cols: order, Cone: c}
}

// image is a new map that is a combination of old rows, nothing else.
func image(f model.Field, c model.ConeKind, of *Combination) Image {
	return Image{Field: f, Cone: model.Cone{Kind: c}, Rows: of.Lin.Rows(), Of: of}
}

// table writes a combination row by row; columns rise within a row.
type table struct{ m model.Matrix }

func newTable() *table {
	return &table{model.Matrix{Start: []int{0}, Z: []complex128{}}}
}

// add puts coefficient c on column j of the present row.
func (t *table) add(j int, c complex128) {
	t.m.Col, t.m.Z = append(t.m.Col, uint32(j)), append(t.m.Z, c)
}

// end finishes the present row.
func (t *table) end() { t.m.Start = append(t.m.Start, len(t.m.Col)) }

// row writes a row of one coefficient.
func (t *table) row(j int, c complex128) {
	t.add(j, c)
	t.end()
}

func (t *table) combination() *Combination { return &Combination{Lin: t.m} }

// identity is c times the identity on n rows.
func identity(n int, c complex128) *Combination {
	t := newTable()
	for j := range n {
		t.row(j, c)
	}
	return t.combination()
}

// Coefficients that take a part of a complex row into a real one: Re(1 z) = Re z, Re(-i z) = Im z.
const (
	takeRe = complex128(1)
	takeIm = -1i
)
