package csdp

import (
	"math"

	"towpath/model"
)

// contradiction answers a model with the row 0 = b: the row's own multiplier is the certificate.
func (p *problem) contradiction(row int, b float64) *model.Answer {
	y := p.noMultipliers()
	for k := range p.m.Constraints {
		if n := p.m.Constraints[k].Map.Rows(); row < n {
			y.Constraints[k][row] = complex(1/b, 0)
			break
		} else {
			row -= n
		}
	}
	return &model.Answer{Outcome: model.Infeasible, Objective: math.NaN(), Bound: math.NaN(), Farkas: y, Note: "a row without entries contradicts itself; csdp was not run"}
}

// slide answers a model with a free column that has a cost and appears in no constraint.
func (p *problem) slide(col int, cost float64) *model.Answer {
	x := p.noPoint()
	for k := range x.Values {
		if n := len(x.Values[k]); col < n {
			x.Values[k][col] = complex(-1/cost, 0)
			break
		} else {
			col -= n
		}
	}
	return &model.Answer{Outcome: model.Unbounded, Objective: math.NaN(), Bound: math.NaN(), Ray: x, Note: "a free column with a cost is in no constraint; csdp was not run"}
}

func (p *problem) noMultipliers() *model.Multipliers {
	y := &model.Multipliers{Bounds: make([][]complex128, len(p.m.Blocks))}
	for k := range p.m.Constraints {
		y.Constraints = append(y.Constraints, make([]complex128, p.m.Constraints[k].Map.Rows()))
	}
	return y
}

func (p *problem) noPoint() *model.Point {
	x := &model.Point{}
	for k := range p.m.Blocks {
		x.Values = append(x.Values, make([]complex128, p.m.Blocks[k].Entries()))
	}
	return x
}
