package wire

import (
	"fmt"
	"math"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

// AnswerToProto encodes an answer in the terms of its model. Examination, route, back end and timings are the caller's.
func AnswerToProto(m *model.Model, a *model.Answer) *towpathv1.Answer {
	p := &towpathv1.Answer{Outcome: towpathv1.Outcome(a.Outcome), Objective: known(a.Objective), Bound: known(a.Bound), Iterations: uint32(a.Iterations), Note: a.Note}
	p.Values = pointToProto(m, a.Point)
	p.Multipliers = multipliersToProto(m, a.Multipliers)
	switch {
	case a.Farkas != nil:
		p.Certificate = &towpathv1.Certificate{Proof: &towpathv1.Certificate_Infeasibility{Infeasibility: multipliersToProto(m, a.Farkas)}}
	case a.Ray != nil:
		p.Certificate = &towpathv1.Certificate{Proof: &towpathv1.Certificate_Unboundedness{Unboundedness: &towpathv1.Direction{Blocks: pointToProto(m, a.Ray)}}}
	}
	return p
}

// known is nil for NaN.
func known(x float64) *float64 {
	if math.IsNaN(x) {
		return nil
	}
	return &x
}

func pointToProto(m *model.Model, p *model.Point) []*towpathv1.BlockValues {
	if p == nil {
		return nil
	}
	var out []*towpathv1.BlockValues
	for k, v := range p.Values {
		out = append(out, blockValues(&m.Blocks[k], v))
	}
	return out
}

func blockValues(b *model.Block, v []complex128) *towpathv1.BlockValues {
	return &towpathv1.BlockValues{Name: b.Name, Field: fieldToProto(b.Field), Rows: uint64(b.Rows), Cols: uint64(b.Cols), Entries: numbersToProto(v, b.Field.IsComplex())}
}

func multipliersToProto(m *model.Model, y *model.Multipliers) *towpathv1.Multipliers {
	if y == nil {
		return nil
	}
	out := &towpathv1.Multipliers{}
	for k, v := range y.Constraints {
		c := &m.Constraints[k]
		rows := uint64(c.Map.Rows())
		if c.Map.Field.IsMatrix() {
			order, _ := model.PackedOrder(c.Map.Rows())
			rows = uint64(order)
		}
		out.Constraints = append(out.Constraints, &towpathv1.RowMultipliers{Name: c.Name, Field: fieldToProto(c.Map.Field), Rows: rows, Values: numbersToProto(v, c.Map.Field.IsComplex())})
	}
	for k := range m.Blocks {
		if m.Blocks[k].Bounds != nil {
			out.Bounds = append(out.Bounds, blockValues(&m.Blocks[k], y.Bounds[k]))
		}
	}
	return out
}

// AnswerFromProto decodes an answer to the given model: what a client does with it.
func AnswerFromProto(m *model.Model, p *towpathv1.Answer) (*model.Answer, error) {
	a := &model.Answer{Outcome: model.Outcome(p.GetOutcome()), Objective: math.NaN(), Bound: math.NaN(), Iterations: int(p.GetIterations()), Note: p.GetNote()}
	if p.Objective != nil {
		a.Objective = *p.Objective
	}
	if p.Bound != nil {
		a.Bound = *p.Bound
	}
	var err error
	if len(p.GetValues()) > 0 {
		if a.Point, err = pointFromProto(m, p.GetValues()); err != nil {
			return nil, err
		}
	}
	if p.GetMultipliers() != nil {
		if a.Multipliers, err = multipliersFromProto(m, p.GetMultipliers()); err != nil {
			return nil, err
		}
	}
	if y := p.GetCertificate().GetInfeasibility(); y != nil {
		if a.Farkas, err = multipliersFromProto(m, y); err != nil {
			return nil, err
		}
	}
	if d := p.GetCertificate().GetUnboundedness(); d != nil {
		if a.Ray, err = pointFromProto(m, d.GetBlocks()); err != nil {
			return nil, err
		}
	}
	return a, nil
}

func pointFromProto(m *model.Model, p []*towpathv1.BlockValues) (*model.Point, error) {
	if len(p) != len(m.Blocks) {
		return nil, fmt.Errorf("the answer has %d blocks, the model %d", len(p), len(m.Blocks))
	}
	out := &model.Point{}
	for k, b := range p {
		v, err := numbersFromProto(b.GetEntries(), fmt.Sprintf("values[%d]", k), model.Title("block", k, b.GetName()))
		if err != nil {
			return nil, err
		}
		if n := m.Blocks[k].Entries(); len(v) != n {
			return nil, fmt.Errorf("the answer has %d numbers for %s, which has %d", len(v), model.Title("block", k, b.GetName()), n)
		}
		out.Values = append(out.Values, v)
	}
	return out, nil
}

func multipliersFromProto(m *model.Model, p *towpathv1.Multipliers) (*model.Multipliers, error) {
	if len(p.GetConstraints()) != len(m.Constraints) {
		return nil, fmt.Errorf("the answer has multipliers for %d constraints, the model has %d", len(p.GetConstraints()), len(m.Constraints))
	}
	y := &model.Multipliers{Bounds: make([][]complex128, len(m.Blocks))}
	for k, c := range p.GetConstraints() {
		v, err := numbersFromProto(c.GetValues(), fmt.Sprintf("multipliers.constraints[%d]", k), model.Title("constraint", k, c.GetName()))
		if err != nil {
			return nil, err
		}
		if n := m.Constraints[k].Map.Rows(); len(v) != n {
			return nil, fmt.Errorf("the answer has %d multipliers for %s, which has %d rows", len(v), model.Title("constraint", k, c.GetName()), n)
		}
		y.Constraints = append(y.Constraints, v)
	}
	left := p.GetBounds()
	for k := range m.Blocks {
		if m.Blocks[k].Bounds == nil {
			continue
		}
		if len(left) == 0 {
			return nil, fmt.Errorf("the answer has no multipliers for the bounds of %s", model.Title("block", k, m.Blocks[k].Name))
		}
		v, err := numbersFromProto(left[0].GetEntries(), "multipliers.bounds", model.Title("block", k, m.Blocks[k].Name))
		if err != nil {
			return nil, err
		}
		if len(v) != m.Blocks[k].Entries() {
			return nil, fmt.Errorf("the answer has %d multipliers for the bounds of %s", len(v), model.Title("block", k, m.Blocks[k].Name))
		}
		y.Bounds[k], left = v, left[1:]
	}
	return y, nil
}
