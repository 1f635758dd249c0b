package wire

import (
	"fmt"
	"math"
	"slices"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

// ModelFromProto decodes a model. Arrays are shared with the message where host and alignment allow, so the message must
// not be changed afterwards. The model still has to be validated; decoding only checks what it needs itself, sizes
// before it allocates.
func ModelFromProto(p *towpathv1.Model) (*model.Model, error) {
	if p == nil {
		return nil, fault("model", "the request", "it has no model", "give a model, or the name of an uploaded one")
	}
	d := &decoder{m: &model.Model{Name: p.GetName()}, starts: []int{0}, number: map[string]int{}, spare: spareNumbers}
	for k, b := range p.GetBlocks() {
		if err := d.block(k, b); err != nil {
			return nil, err
		}
	}
	if err := d.objective(p.GetObjective()); err != nil {
		return nil, err
	}
	for k, c := range p.GetConstraints() {
		if err := d.constraint(k, c); err != nil {
			return nil, err
		}
	}
	return d.m, nil
}

// decoder turns one message into a model.
type decoder struct {
	m      *model.Model
	starts []int
	number map[string]int // of blocks, by name
	spare  int            // numbers that may still be made of nothing
}

// spareNumbers bounds what a model may make of nothing, by one limit for many entries or by rows without terms: numbers
// that the message did not pay for, so that a small message cannot ask for all memory there is.
const spareNumbers = 1 << 25

// spend takes n numbers out of what may be made of nothing.
func (d *decoder) spend(n int) bool {
	if n > d.spare {
		return false
	}
	d.spare -= n
	return true
}

func fieldFromProto(f towpathv1.Field, path, place string) (model.Field, error) {
	if f < towpathv1.Field_FIELD_REAL || f > towpathv1.Field_FIELD_HERMITIAN {
		return 0, fault(path+".field", place, "its field is missing or unknown", "use FIELD_REAL, FIELD_COMPLEX, FIELD_SYMMETRIC or FIELD_HERMITIAN")
	}
	return model.Field(f - 1), nil
}

func coneFromProto(c towpathv1.Cone, path, place string) (model.ConeKind, error) {
	if c < towpathv1.Cone_CONE_FREE || c > towpathv1.Cone_CONE_PSD {
		return 0, fault(path+".cone", place, "its cone is missing or unknown", "use one of CONE_ZERO, CONE_NONNEG, CONE_RANGE, CONE_LORENTZ, CONE_ROTATED_LORENTZ, CONE_PSD (and CONE_FREE for blocks)")
	}
	return model.ConeKind(c - 1), nil
}

// dimension refuses sizes that no model can have.
func dimension(n uint64, path, place string) (int, error) {
	if n > model.MaxEntries {
		return 0, fault(path, place, fmt.Sprintf("the size %d is more than 4294967295", n), "split the model")
	}
	return int(n), nil
}

func (d *decoder) block(k int, p *towpathv1.Block) error {
	path, place := fmt.Sprintf("blocks[%d]", k), model.Title("block", k, p.GetName())
	field, err := fieldFromProto(p.GetField(), path, place)
	if err != nil {
		return err
	}
	cone := model.Free
	if p.GetCone() != towpathv1.Cone_CONE_UNSPECIFIED {
		if cone, err = coneFromProto(p.GetCone(), path, place); err != nil {
			return err
		}
	}
	b := model.Block{Name: p.GetName(), Field: field, Cone: cone}
	if b.Rows, err = dimension(p.GetRows(), path+".rows", place); err != nil {
		return err
	}
	if b.Cols, err = dimension(p.GetCols(), path+".cols", place); err != nil {
		return err
	}
	if b.Rows == 0 {
		return fault(path+".rows", place, "it has no rows", "give its length, or its order for a matrix")
	}
	if b.Cols == 0 {
		b.Cols = 1
		if field.IsMatrix() {
			b.Cols = b.Rows
		}
	}
	if field.IsMatrix() && b.Rows > model.MaxOrder || !field.IsMatrix() && b.Rows > model.MaxEntries/b.Cols || b.Entries() > model.MaxEntries-d.starts[k] {
		return fault(path+".rows", place, fmt.Sprintf("with %d x %d entries the model has more than 4294967295", b.Rows, b.Cols), "split the model")
	}
	n := b.Entries()
	if p.GetLower() != nil || p.GetUpper() != nil {
		b.Bounds = &model.Bounds{}
		if b.Bounds.Lower, err = d.limits(p.GetLower(), n, math.Inf(-1), b.RealEntry, path+".lower", place); err != nil {
			return err
		}
		if b.Bounds.Upper, err = d.limits(p.GetUpper(), n, math.Inf(1), b.RealEntry, path+".upper", place); err != nil {
			return err
		}
	}
	d.m.Blocks = append(d.m.Blocks, b)
	d.starts = append(d.starts, d.starts[k]+n)
	if _, twice := d.number[b.Name]; !twice {
		d.number[b.Name] = k
	}
	return nil
}

// limits decodes limits: none, one for all, or one for each of n. absent stands for no limit; a list without imaginary
// parts does not limit imaginary parts.
func (d *decoder) limits(p *towpathv1.Numbers, n int, absent float64, isReal func(int) bool, path, place string) ([]complex128, error) {
	x, err := numbersFromProto(p, path, place)
	if err != nil {
		return nil, err
	}
	realOnly := p.GetC128() == nil && len(p.GetIm()) == 0
	if len(x) == 0 {
		x = []complex128{complex(absent, absent)}
	}
	if len(x) != n && len(x) != 1 {
		return nil, fault(path, place, fmt.Sprintf("there are %d limits for %d numbers", len(x), n), "give one for each, or one for all")
	}
	if len(x) == 1 {
		if !d.spend(n) {
			return nil, fault(path, place, fmt.Sprintf("one limit is given for %d numbers", n), "give limits one by one where there are very many")
		}
		x = slices.Repeat(x, n)
	} else {
		x = slices.Clone(x)
	}
	for i := range x {
		switch {
		case isReal(i) && math.IsInf(imag(x[i]), 0):
			x[i] = complex(real(x[i]), 0)
		case !isReal(i) && realOnly:
			x[i] = complex(real(x[i]), absent)
		}
	}
	return x, nil
}

func (d *decoder) objective(p *towpathv1.Objective) error {
	const path, place = "objective", "the objective"
	o := &d.m.Objective
	switch p.GetSense() {
	case towpathv1.Sense_SENSE_UNSPECIFIED, towpathv1.Sense_SENSE_MINIMIZE:
	case towpathv1.Sense_SENSE_MAXIMIZE:
		o.Sense = model.Maximize
	default:
		return fault(path+".sense", place, "its sense is unknown", "use SENSE_MINIMIZE or SENSE_MAXIMIZE")
	}
	o.Const = p.GetConstant()
	var m model.Matrix
	if p.GetCoefficients() != nil {
		if len(p.GetTerms()) > 0 {
			return fault(path, place, "it has terms and compressed coefficients", "give one of the two")
		}
		var err error
		if m, err = matrixFromProto(p.GetCoefficients(), 1, path+".coefficients", place); err != nil {
			return err
		}
		if have := max(len(m.Re), len(m.Z)); have != len(m.Col) || m.Start[0] != 0 || m.Start[1] != len(m.Col) {
			return fault(path+".coefficients", place, fmt.Sprintf("it has %d columns, %d values and a row from %d to %d", len(m.Col), have, m.Start[0], m.Start[1]), "give one value per column, in one row")
		}
	} else {
		var terms []term
		for i, t := range p.GetTerms() {
			x, err := d.term(t, 1, 0, fmt.Sprintf("%s.terms[%d]", path, i), place)
			if err != nil {
				return err
			}
			if x.conj { // Re(c conj(x)) = Re(conj(c) x)
				x.c, x.conj = complex(real(x.c), -imag(x.c)), false
			}
			terms = append(terms, x)
		}
		m = gather(terms, 1, false)
	}
	o.Col = m.Col
	for i := range m.Col {
		o.Coef = append(o.Coef, m.At(i))
	}
	return nil
}

func (d *decoder) constraint(k int, p *towpathv1.Constraint) error {
	path, place := fmt.Sprintf("constraints[%d]", k), model.Title("constraint", k, p.GetName())
	field, err := fieldFromProto(p.GetField(), path, place)
	if err != nil {
		return err
	}
	cone, err := coneFromProto(p.GetCone(), path, place)
	if err != nil {
		return err
	}
	rows, err := dimension(p.GetRows(), path+".rows", place)
	if err != nil {
		return err
	}
	if rows == 0 {
		return fault(path+".rows", place, "it has no rows", "leave it out, or give its number of rows (its order for a matrix)")
	}
	order := 0
	if field.IsMatrix() {
		if rows > model.MaxOrder {
			return fault(path+".rows", place, fmt.Sprintf("order %d is larger than %d", rows, model.MaxOrder), "split the constraint")
		}
		order, rows = rows, model.PackedLen(rows)
	}
	c := model.Constraint{Name: p.GetName(), Cone: model.Cone{Kind: cone}, Map: model.Map{Field: field}}
	if p.GetCoefficients() != nil || p.GetConjugateCoefficients() != nil {
		err = d.compressedMap(&c.Map, p, rows, path, place)
	} else {
		err = d.termMap(&c.Map, p, rows, order, path, place)
	}
	if err != nil {
		return err
	}
	if p.GetConstant() != nil {
		if c.Map.Const, err = numbersFromProto(p.GetConstant(), path+".constant", place); err != nil {
			return err
		}
	}
	if cone == model.Range {
		isReal := func(int) bool { return field != model.Complex }
		if c.Cone.Lower, err = d.limits(p.GetLower(), rows, math.Inf(-1), isReal, path+".lower", place); err != nil {
			return err
		}
		if c.Cone.Upper, err = d.limits(p.GetUpper(), rows, math.Inf(1), isReal, path+".upper", place); err != nil {
			return err
		}
	} else if p.GetLower() != nil || p.GetUpper() != nil {
		return fault(path+".lower", place, "it has limits but its cone is not CONE_RANGE", "leave them out, or use CONE_RANGE")
	}
	d.m.Constraints = append(d.m.Constraints, c)
	return nil
}

func (d *decoder) compressedMap(m *model.Map, p *towpathv1.Constraint, rows int, path, place string) (err error) {
	if len(p.GetTerms()) > 0 {
		return fault(path, place, "it has terms and compressed coefficients", "give one of the two")
	}
	if p.GetCoefficients() == nil {
		return fault(path+".coefficients", place, "it has coefficients on conjugates and none on entries", "give coefficients, with all row starts 0 when there are none")
	}
	if m.Lin, err = matrixFromProto(p.GetCoefficients(), rows, path+".coefficients", place); err != nil {
		return err
	}
	if p.GetConjugateCoefficients() != nil {
		conj, err := matrixFromProto(p.GetConjugateCoefficients(), rows, path+".conjugate_coefficients", place)
		if err != nil {
			return err
		}
		m.Conj = &conj
	}
	return nil
}

func (d *decoder) termMap(m *model.Map, p *towpathv1.Constraint, rows, order int, path, place string) error {
	if rows > len(p.GetTerms()) && !d.spend(rows-len(p.GetTerms())) {
		return fault(path+".rows", place, fmt.Sprintf("%d rows have only %d terms", rows, len(p.GetTerms())), "send large maps as compressed coefficients")
	}
	var terms []term
	conj := false
	for i, t := range p.GetTerms() {
		x, err := d.term(t, rows, order, fmt.Sprintf("%s.terms[%d]", path, i), place)
		if err != nil {
			return err
		}
		conj = conj || x.conj
		terms = append(terms, x)
	}
	m.Lin = gather(terms, rows, false)
	if conj {
		c := gather(terms, rows, true)
		m.Conj = &c
	}
	return nil
}

// matrixFromProto decodes compressed rows; what is in them is validated with the model.
func matrixFromProto(p *towpathv1.CompressedRows, rows int, path, place string) (m model.Matrix, err error) {
	starts, err := arrayBytes(p.GetStarts(), path+".starts", place, 8)
	if err != nil {
		return m, err
	}
	if len(starts)/8 != rows+1 {
		return m, fault(path+".starts", place, fmt.Sprintf("there are %d row starts for %d rows", len(starts)/8, rows), "give one more than rows")
	}
	columns, err := arrayBytes(p.GetColumns(), path+".columns", place, 4)
	if err != nil {
		return m, err
	}
	if p.GetF64() != nil && p.GetC128() != nil {
		return m, fault(path, place, "there are real and complex values", "give f64 or c128")
	}
	m.Start = numbersIn(starts, littleEndian(), decodeStart)
	m.Col = numbersIn(columns, littleEndian(), decodeColumn)
	if p.GetC128() != nil {
		values, err := arrayBytes(p.GetC128(), path+".c128", place, 16)
		m.Z = numbersIn(values, littleEndian(), decodeComplex)
		return m, err
	}
	values, err := arrayBytes(p.GetF64(), path+".f64", place, 8)
	m.Re = numbersIn(values, littleEndian(), decodeReal)
	return m, err
}
