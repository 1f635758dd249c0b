package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// Lift carries an answer to the lowered model back into the client's terms: values and rays by the combinations that the
// bridges stated, multipliers and certificates by their adjoints under the inner products of package model. Objective
// and bound take the client's sense again. The answer is not modified; it must have the lowered model's shape.
func (x *Crossing) Lift(a *model.Answer) *model.Answer {
	out := *a
	if x.d.obj.Sense == model.Maximize {
		out.Objective, out.Bound = -a.Objective, -a.Bound
	}
	out.Point, out.Ray = x.liftPoint(a.Point), x.liftPoint(a.Ray)
	out.Multipliers, out.Farkas = x.liftMultipliers(a.Multipliers), x.liftMultipliers(a.Farkas)
	return &out
}

func (x *Crossing) liftPoint(p *model.Point) *model.Point {
	if p == nil {
		return nil
	}
	d := x.d
	values := make([]complex128, len(d.owner))
	for i := range d.blocks {
		if b := &d.blocks[i]; !b.gone {
			copy(values[b.start:], p.Values[b.final])
		}
	}
	// Columns stand for newer ones only, so the newest blocks come first.
	for i := len(d.blocks) - 1; i >= 0; i-- {
		b := &d.blocks[i]
		if !b.gone {
			continue
		}
		for k := range b.block.Entries() {
			var v complex128
			b.values.each(k, func(j int, p, q complex128) {
				y := values[b.next+j]
				v += p*y + q*conj(y)
			})
			if b.block.RealEntry(k) {
				v = complex(real(v), 0)
			}
			values[b.start+k] = v
		}
	}
	out := &model.Point{}
	for i := range x.blocks {
		b := &d.blocks[i]
		end := b.start + b.block.Entries()
		out.Values = append(out.Values, values[b.start:end:end])
	}
	return out
}

func (x *Crossing) liftMultipliers(y *model.Multipliers) *model.Multipliers {
	if y == nil {
		return nil
	}
	d := x.d
	maps, bounds := make([][]complex128, len(d.maps)), make([][]complex128, len(d.blocks))
	for i := range d.maps {
		if m := &d.maps[i]; !m.gone {
			maps[i] = y.Constraints[m.final]
		}
	}
	for i := range d.blocks {
		if b := &d.blocks[i]; !b.gone && b.bounds != nil {
			bounds[i] = y.Bounds[b.final]
		}
	}
	for t := len(d.crossed) - 1; t >= 0; t-- {
		c := &d.crossed[t]
		switch c.place {
		case capability.OnMap:
			old := &d.maps[c.number].c
			maps[c.number] = adjoint(c.low, maps[c.image:], old.Map.Rows(), old.RealRow, old.Weight)
		case capability.OnBounds:
			b := &d.blocks[c.number].block
			bounds[c.number] = adjoint(c.low, maps[c.image:], b.Entries(), b.RealEntry, b.Weight)
		}
	}
	for i := range x.maps { // those that were left behind
		if maps[i] == nil {
			maps[i] = make([]complex128, d.maps[i].c.Map.Rows())
		}
	}
	for i := range x.blocks {
		if x.bounded[i] && bounds[i] == nil {
			bounds[i] = make([]complex128, d.blocks[i].block.Entries())
		}
	}
	return &model.Multipliers{Constraints: maps[:x.maps:x.maps], Bounds: bounds[:x.blocks:x.blocks]}
}

// adjoint returns the multiplier of the rows (or entries) that the images are made of. With w the weights of the inner
// products, and new row r = sum_j alpha_rj row_j + beta_rj conj(row_j),
//
//	w_j lambda_j = sum over r of w_r (conj(alpha_rj) y_r + beta_rj conj(y_r)),
//
// which makes sum_r w_r <new row_r, y_r> = sum_j w_j <row_j, lambda_j> whatever the rows are.
func adjoint(low *Lowering, images [][]complex128, n int, realRow func(int) bool, weight func(int) float64) []complex128 {
	out := make([]complex128, n)
	for i := range low.Constraints {
		im := &low.Constraints[i]
		shape := im.shape()
		for r := range im.Rows {
			y := images[i][r] * complex(shape.Weight(r), 0)
			im.Of.each(r, func(j int, a, b complex128) { out[j] += conj(a)*y + b*conj(y) })
		}
	}
	for j := range out {
		if realRow(j) {
			out[j] = complex(real(out[j]), 0)
		}
		out[j] /= complex(weight(j), 0)
	}
	return out
}
