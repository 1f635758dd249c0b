package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// complexRange writes limits on real and imaginary parts of complex rows as limits on real rows. Parts without a finite
// limit are dropped. Multipliers come back as y_Re + i y_Im.
// Toll: one row per limited part.
type complexRange struct{ rule }

func newComplexRange() Bridge {
	return complexRange{rule{"complex-range/real-parts", mapKind(model.Complex, model.Range), "definition of the complex numbers"}}
}

func (complexRange) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Range), n), true
}

func (complexRange) Lower(it Item) Lowering {
	complexPart := func(int) bool { return false }
	return Lowering{Constraints: []Image{limitRows(it.Rows, it.Cone.Lower, it.Cone.Upper, complexPart)}}
}

// limitRows makes a real range map of the parts of n rows (or entries) that have a finite limit.
func limitRows(n int, lower, upper []complex128, isReal func(int) bool) Image {
	t := newTable()
	cone := model.Cone{Kind: model.Range}
	put := func(j int, take complex128, lo, up float64) {
		if isFinite(lo) || isFinite(up) {
			t.row(j, take)
			cone.Lower, cone.Upper = append(cone.Lower, complex(lo, 0)), append(cone.Upper, complex(up, 0))
		}
	}
	for j := range n {
		put(j, takeRe, real(lower[j]), real(upper[j]))
		if !isReal(j) {
			put(j, takeIm, imag(lower[j]), imag(upper[j]))
		}
	}
	im := image(model.Real, model.Range, t.combination())
	im.Cone = cone
	return im
}
