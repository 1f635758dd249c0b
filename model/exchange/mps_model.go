package exchange

import (
	"fmt"
	"math"
	"slices"

	"towpath/model"
)

// model makes blocks and constraints, now that all is read.
func (p *mps) model() (*model.Model, error) {
	if p.objective < 0 {
		return nil, fault(0, "it has no N row", "declare the objective in ROWS")
	}
	m := &model.Model{Name: p.name}
	m.Objective.Sense = p.sense
	for k := range p.columns {
		b, err := p.columns[k].block()
		if err != nil {
			return nil, err
		}
		m.Blocks = append(m.Blocks, b)
	}
	for r := range p.rows {
		row := &p.rows[r]
		slices.SortFunc(row.entries, func(a, b mpsEntry) int { return a.column - b.column })
		switch {
		case r == p.objective:
			for _, e := range row.entries {
				m.Objective.Col = append(m.Objective.Col, uint32(e.column))
				m.Objective.Coef = append(m.Objective.Coef, complex(e.value, 0))
			}
			m.Objective.Const = 0 - row.rhs // not -0
		case row.kind != 'N':
			m.Constraints = append(m.Constraints, row.constraint())
		}
	}
	return m, nil
}

func (c *mpsColumn) block() (model.Block, error) {
	b := model.Block{Name: c.name, Field: model.Real, Rows: 1, Cols: 1}
	lower := c.lower
	if c.upper < 0 && c.loLine == 0 {
		return b, fault(c.upLine, fmt.Sprintf("column %s has the negative upper bound %g and no lower one, which programs read in two ways", clip(c.name), c.upper),
			"state the lower bound too, with LO or MI")
	}
	if lower == 0 {
		b.Cone = model.Nonneg
		lower = math.Inf(-1)
	}
	if !math.IsInf(lower, -1) || !math.IsInf(c.upper, 1) {
		b.Bounds = &model.Bounds{Lower: []complex128{complex(lower, 0)}, Upper: []complex128{complex(c.upper, 0)}}
	}
	return b, nil
}

func (r *mpsRow) constraint() model.Constraint {
	c := model.Constraint{Name: r.name}
	sign, shift := 1.0, r.rhs
	switch {
	case r.rangeSet > 0:
		lower, upper := r.rhs, r.rhs
		switch {
		case r.kind == 'G' || r.kind == 'E' && r.spread > 0:
			upper += math.Abs(r.spread)
		default:
			lower -= math.Abs(r.spread)
		}
		c.Cone = model.Cone{Kind: model.Range, Lower: []complex128{complex(lower, 0)}, Upper: []complex128{complex(upper, 0)}}
		shift = 0
	case r.kind == 'E':
		c.Cone.Kind = model.Zero
	case r.kind == 'L':
		c.Cone.Kind, sign = model.Nonneg, -1
	default:
		c.Cone.Kind = model.Nonneg
	}
	c.Map.Lin.Start = []int{0, len(r.entries)}
	for _, e := range r.entries {
		c.Map.Lin.Col = append(c.Map.Lin.Col, uint32(e.column))
		c.Map.Lin.Re = append(c.Map.Lin.Re, sign*e.value)
	}
	if shift != 0 {
		c.Map.Const = []complex128{complex(-sign*shift, 0)}
	}
	return c
}
