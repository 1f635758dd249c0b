package check

import "towpath/model"

// swept is below which share of the largest number of a certificate a number counts as a solver's rounding.
const swept = 1e-6

// sweptMultipliers is a certificate without its smallest numbers. What a solver leaves of a multiplier that should be zero has
// residuals as large as itself; without it the certificate is as good or better. Rows that stand for themselves go one by
// one, those of other cones together.
func sweptMultipliers(m *model.Model, y *model.Multipliers) *model.Multipliers {
	limit := swept * max(largest(y.Constraints), largest(y.Bounds))
	out := &model.Multipliers{}
	for k, v := range y.Constraints {
		out.Constraints = append(out.Constraints, sweep(v, limit, splits(m.Constraints[k].Cone.Kind)))
	}
	for _, v := range y.Bounds {
		out.Bounds = append(out.Bounds, sweep(v, limit, true))
	}
	return out
}

// sweptPoint is the like for a ray.
func sweptPoint(m *model.Model, x *model.Point) *model.Point {
	limit := swept * largest(x.Values)
	out := &model.Point{}
	for b, v := range x.Values {
		out.Values = append(out.Values, sweep(v, limit, splits(m.Blocks[b].Cone)))
	}
	return out
}

// splits reports whether the rows (entries) of a cone stand for themselves.
func splits(kind model.ConeKind) bool {
	switch kind {
	case model.Free, model.Zero, model.Nonneg, model.Range:
		return true
	}
	return false
}

func sweep(v []complex128, limit float64, single bool) []complex128 {
	if v == nil {
		return nil
	}
	out := make([]complex128, len(v))
	if !single && largest([][]complex128{v}) > limit {
		copy(out, v)
		return out
	}
	for k, x := range v {
		if single && size(x) > limit {
			out[k] = x
		}
	}
	return out
}
