package wire

import (
	"slices"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

func fieldToProto(f model.Field) towpathv1.Field  { return towpathv1.Field(f) + 1 }
func coneToProto(c model.ConeKind) towpathv1.Cone { return towpathv1.Cone(c) + 1 }

// ModelToProto encodes a valid model: few coefficients as readable terms, many as compressed rows, which share the
// model's memory where the host allows.
func ModelToProto(m *model.Model) *towpathv1.Model {
	p := &towpathv1.Model{Name: m.Name}
	for k := range m.Blocks {
		b := &m.Blocks[k]
		q := &towpathv1.Block{Name: b.Name, Field: fieldToProto(b.Field), Rows: uint64(b.Rows), Cone: coneToProto(b.Cone)}
		if !b.Field.IsMatrix() && b.Cols != 1 {
			q.Cols = uint64(b.Cols)
		}
		if b.Bounds != nil {
			q.Lower, q.Upper = numbersToProto(b.Bounds.Lower, b.Field.IsComplex()), numbersToProto(b.Bounds.Upper, b.Field.IsComplex())
		}
		p.Blocks = append(p.Blocks, q)
	}
	t := termWriter{m, m.Starts()}
	o := &m.Objective
	p.Objective = &towpathv1.Objective{Sense: towpathv1.Sense(o.Sense) + 1, Constant: o.Const}
	if len(o.Col) <= readable {
		for i, col := range o.Col {
			p.Objective.Terms = append(p.Objective.Terms, t.term(nil, col, o.Coef[i], false))
		}
	} else {
		p.Objective.Coefficients = matrixToProto(&model.Matrix{Start: []int{0, len(o.Col)}, Col: o.Col, Z: o.Coef})
	}
	for k := range m.Constraints {
		p.Constraints = append(p.Constraints, t.constraint(&m.Constraints[k]))
	}
	return p
}

// readableRows is how many rows a map may have and still be written in terms; compressed rows pay for their rows, terms
// do not (see spareNumbers).
const readableRows = 1 << 10

// termWriter writes coefficients as terms.
type termWriter struct {
	m      *model.Model
	starts []int
}

func (t termWriter) constraint(c *model.Constraint) *towpathv1.Constraint {
	rows := c.Map.Rows()
	q := &towpathv1.Constraint{Name: c.Name, Field: fieldToProto(c.Map.Field), Rows: uint64(rows), Cone: coneToProto(c.Cone.Kind)}
	order := 0
	if c.Map.Field.IsMatrix() {
		order, _ = model.PackedOrder(rows)
		q.Rows = uint64(order)
	}
	isComplex := c.Map.Field.IsComplex()
	if c.Map.Const != nil {
		q.Constant = numbersToProto(c.Map.Const, isComplex)
	}
	if c.Cone.Kind == model.Range {
		q.Lower, q.Upper = numbersToProto(c.Cone.Lower, isComplex), numbersToProto(c.Cone.Upper, isComplex)
	}
	if c.Map.Nonzeros() > readable || rows > readableRows {
		q.Coefficients = matrixToProto(&c.Map.Lin)
		if c.Map.Conj != nil {
			q.ConjugateCoefficients = matrixToProto(c.Map.Conj)
		}
		return q
	}
	for r := range rows {
		row := []uint64{uint64(r)}
		if order > 0 {
			i, j := model.PackedAt(order, r)
			row = []uint64{uint64(i), uint64(j)}
		}
		put := func(m *model.Matrix, conj bool) {
			for x := m.Start[r]; x < m.Start[r+1]; x++ {
				q.Terms = append(q.Terms, t.term(row, m.Col[x], m.At(x), conj))
			}
		}
		put(&c.Map.Lin, false)
		if c.Map.Conj != nil {
			put(c.Map.Conj, true)
		}
	}
	return q
}

func (t termWriter) term(row []uint64, col uint32, c complex128, conj bool) *towpathv1.Term {
	k, _ := slices.BinarySearch(t.starts, int(col)+1)
	k--
	b, at := &t.m.Blocks[k], int(col)-t.starts[k]
	out := &towpathv1.Term{Row: row, Re: real(c), Im: imag(c), Conjugate: conj}
	switch {
	case b.Field.IsMatrix():
		i, j := model.PackedAt(b.Rows, at)
		out.Entry = []uint64{uint64(i), uint64(j)}
	case b.Cols > 1:
		out.Entry = []uint64{uint64(at % b.Rows), uint64(at / b.Rows)}
	default:
		out.Entry = []uint64{uint64(at)}
	}
	if b.Name != "" {
		out.Of = &towpathv1.Term_Block{Block: b.Name}
	} else {
		out.Of = &towpathv1.Term_BlockNumber{BlockNumber: uint32(k)}
	}
	return out
}

func matrixToProto(m *model.Matrix) *towpathv1.CompressedRows {
	p := &towpathv1.CompressedRows{
		Starts:  arrayOf(bytesIn(m.Start, littleEndian(), encodeStart)),
		Columns: arrayOf(bytesIn(m.Col, littleEndian(), encodeColumn)),
	}
	if m.Z != nil {
		p.C128 = arrayOf(bytesIn(m.Z, littleEndian(), encodeComplex))
	} else {
		p.F64 = arrayOf(bytesIn(m.Re, littleEndian(), encodeReal))
	}
	return p
}
