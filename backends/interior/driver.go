// Package interior is the in-process interior-point engine, complex to the core: Hermitian matrices stay Hermitian,
// complex rows and entries are pairs of coordinates, and nothing is ever embedded in twice the order.
//
// It solves the mixed problem of form by a homogeneous self-dual embedding, so that infeasible and unbounded models end
// with certificates.
package interior

import (
	"context"
	"fmt"
	"math"

	"towpath/backends"
	"towpath/model"
)

// Driver runs the engine. It has no state.
type Driver struct{}

// New returns the engine as a driver.
func New() *Driver { return &Driver{} }

// Solve solves a minimization of the sheet's native kinds.
func (d *Driver) Solve(ctx context.Context, sheet string, m *model.Model, o backends.Options) (*model.Answer, error) {
	s := d.sheet(sheet)
	if s == nil {
		return nil, fmt.Errorf("the interior-point engine has no sheet %q", sheet)
	}
	if err := s.Accepts(m); err != nil {
		return nil, err
	}
	if m.Objective.Sense == model.Maximize {
		return nil, fmt.Errorf("the interior-point engine takes minimizations only")
	}
	f := compile(m)
	if need := f.bytes(); o.MaxMemory > 0 && need > o.MaxMemory {
		return nil, fmt.Errorf("the interior-point engine would need %d bytes for %d rows and %d free columns; %d are allowed", need, f.rows, f.free, o.MaxMemory)
	}
	end, s1, me, iterations := f.run(ctx, o)
	return f.answer(end, s1, me, iterations), nil
}

// bytes predicts the memory of a solve beyond the model.
func (f *form) bytes() int64 {
	n := int64(f.rows + f.free)
	total := 16 * n * n
	for _, it := range f.items {
		total += int64(it.dim()) * 8 * 20
		if c, ok := it.cone.(*psd); ok {
			total += int64(c.n) * int64(c.n) * 16 * 11
		}
	}
	return total
}

// answer writes an iterate in the model's terms.
func (f *form) answer(end ending, s *state, m measure, iterations int) *model.Answer {
	a := &model.Answer{Objective: math.NaN(), Bound: math.NaN(), Iterations: iterations}
	switch end {
	case endInfeasible:
		a.Outcome = model.Infeasible
		s.times(1 / f.residuals(s).by)
		a.Farkas = f.multipliers(s)
		a.Note = fmt.Sprintf("certificate of residual %.1e", m.infeasible)
		return a
	case endUnbounded:
		a.Outcome = model.Unbounded
		s.times(-1 / f.residuals(s).cx)
		a.Ray = f.point(s)
		a.Note = fmt.Sprintf("ray of residual %.1e", m.unbounded)
		return a
	case endOptimal:
		a.Outcome = model.Optimal
	case endStuck:
		a.Outcome = model.Inaccurate
	case endStopped:
		a.Outcome = model.Stopped
	}
	s.times(1 / s.tau)
	a.Objective, a.Bound = m.primalValue+f.constant, m.dualValue+f.constant
	a.Point, a.Multipliers = f.point(s), f.multipliers(s)
	a.Note = fmt.Sprintf("residuals: primal %.1e, dual %.1e, gap %.1e", m.primal, m.dual, m.gap)
	return a
}

func (f *form) point(s *state) *model.Point {
	p := &model.Point{}
	for b := range f.m.Blocks {
		v := make([]complex128, f.m.Blocks[b].Entries())
		for k := range v {
			c := f.entries[f.starts[b]+k]
			x := s.x[f.rows:]
			if c.item >= 0 {
				x = s.p[c.item]
			}
			v[k] = complex(x[c.at]/c.root, 0)
			if !c.real {
				v[k] += complex(0, x[c.at+1]/c.root)
			}
		}
		p.Values = append(p.Values, v)
	}
	return p
}

func (f *form) multipliers(s *state) *model.Multipliers {
	y := &model.Multipliers{Bounds: make([][]complex128, len(f.m.Blocks))}
	for k := range f.m.Constraints {
		c, at := &f.m.Constraints[k], f.where[k]
		v := make([]complex128, c.Map.Rows())
		n := 0
		next := func() float64 {
			defer func() { n++ }()
			if at.rows >= 0 {
				return s.x[at.rows+n] / f.rowScale[at.rows+n]
			}
			return s.q[at.item][n]
		}
		for r := range v {
			root := math.Sqrt(c.Weight(r))
			v[r] = complex(next()/root, 0)
			if !c.RealRow(r) {
				v[r] += complex(0, next()/root)
			}
		}
		y.Constraints = append(y.Constraints, v)
	}
	return y
}

var _ backends.Driver = (*Driver)(nil)
