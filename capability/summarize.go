package capability

import (
	"cmp"
	"math"
	"slices"

	"towpath/model"
)

// Summarize lists what a model asks for, in one pass that counts and never reads a coefficient. Demands are sorted by
// kind and size, each pair once. Nonzeros counts the coefficients of maps; blocks and bounds have none of their own.
func Summarize(m *model.Model) []Demand {
	sum := map[node]*Demand{}
	add := func(k Kind, size, count, nonzeros int) {
		if count == 0 {
			return
		}
		n := node{k, size}
		if sum[n] == nil {
			sum[n] = &Demand{Kind: k, Size: size}
		}
		sum[n].Count += count
		sum[n].Nonzeros += int64(nonzeros)
	}
	for i := range m.Blocks {
		b := &m.Blocks[i]
		kind, size, count := MeasureBlock(b)
		add(kind, size, count, 0)
		if b.Bounds != nil {
			kind, count := MeasureBounds(b)
			add(kind, 1, count, 0)
		}
	}
	for i := range m.Constraints {
		c := &m.Constraints[i]
		kind, size, count := MeasureMap(c)
		add(kind, size, count, c.Map.Nonzeros())
	}
	out := make([]Demand, 0, len(sum))
	for _, d := range sum {
		out = append(out, *d)
	}
	slices.SortFunc(out, compareDemands)
	return out
}

// MeasureBlock says as what a block counts: its kind, its size, and how many of that size it is.
func MeasureBlock(b *model.Block) (kind Kind, size, count int) {
	kind = Kind{OnBlock, b.Field, b.Cone}
	return measure(kind, b.Entries())
}

// MeasureBounds says as how many sides the bounds of a block count; their size is 1.
func MeasureBounds(b *model.Block) (kind Kind, count int) {
	for k := range b.Entries() {
		count += sides(b.Bounds.Lower[k], b.Bounds.Upper[k], b.RealEntry(k))
	}
	return Kind{OnBounds, b.Field, model.Box}, count
}

// MeasureMap says as what a constraint counts.
func MeasureMap(c *model.Constraint) (kind Kind, size, count int) {
	kind = Kind{OnMap, c.Map.Field, c.Cone.Kind}
	if kind.Cone != model.Range {
		return measure(kind, c.Map.Rows())
	}
	for r := range c.Map.Rows() {
		count += sides(c.Cone.Lower[r], c.Cone.Upper[r], kind.Field == model.Real)
	}
	return kind, 1, count
}

func measure(k Kind, n int) (kind Kind, size, count int) {
	switch {
	case k.Separable():
		return k, 1, n
	case k.Field.IsMatrix():
		order, _ := model.PackedOrder(n)
		return k, order, 1
	}
	return k, n, 1
}

func compareDemands(a, b Demand) int {
	return cmp.Or(cmp.Compare(a.Kind.Place, b.Kind.Place), cmp.Compare(a.Kind.Field, b.Kind.Field),
		cmp.Compare(a.Kind.Cone, b.Kind.Cone), cmp.Compare(a.Size, b.Size))
}

// sides counts the finite limits of a pair, of the real part and, where there is one, of the imaginary part.
func sides(lo, up complex128, isReal bool) int {
	n := 0
	for _, x := range []float64{real(lo), real(up)} {
		if !math.IsInf(x, 0) {
			n++
		}
	}
	if !isReal {
		for _, x := range []float64{imag(lo), imag(up)} {
			if !math.IsInf(x, 0) {
				n++
			}
		}
	}
	return n
}
