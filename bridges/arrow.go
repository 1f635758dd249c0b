package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// arrow writes t >= ||x||, x of dimension k, as a positive semidefinite matrix of order k + 1 (Hermitian for complex x):
//
//	[[t, x^H], [x, t I]]
//
// By Schur's complement it is positive semidefinite when t = 0 = x, or t > 0 and t - x^H x / t >= 0. A multiplier Z comes
// back as its adjoint: tr Z for t and 2 Z_i1 for x_i, where the two halves of the matrix meet.
// Toll: a matrix of order k + 1 in place of a cone of dimension k + 1; only for back ends that have nothing smaller.
type arrow struct{ rule }

func newArrow(f model.Field) Bridge {
	id := map[model.Field]string{model.Real: "lorentz-map/symmetric-arrow", model.Complex: "complex-lorentz-map/hermitian-arrow"}[f]
	return arrow{rule{id, mapKind(f, model.Lorentz), "F. Alizadeh and D. Goldfarb, Math. Program. 95 (2003), section 2 (from memory)"}}
}

func (b arrow) field() model.Field {
	if b.from.Field == model.Complex {
		return model.Hermitian
	}
	return model.Symmetric
}

func (b arrow) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(b.field(), model.PSD), n), true
}

func (b arrow) Lower(it Item) Lowering {
	n := it.Rows
	t := newTable()
	for k := range model.PackedLen(n) {
		switch i, j := model.PackedAt(n, k); {
		case i == j:
			t.row(0, 1)
		case j == 0:
			t.row(i, 1)
		default:
			t.end()
		}
	}
	return Lowering{Constraints: []Image{image(b.field(), model.PSD, t.combination())}}
}
