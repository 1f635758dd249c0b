package modeltest

import (
	"cmp"
	"encoding/json"
	"fmt"
	"io"
	"slices"
	"strings"

	"towpath/model"
)

// instance is the test data's notation: blocks, all free, and rows of terms [block, index, re, im]; a block name that
// ends in * means the conjugate; Hermitian entries are [i, j]; matrices list their upper triangle.
type instance struct {
	Name, Sense string
	Vars        []struct {
		Name, Kind string
		Dim        int
	}
	Cons []struct {
		Cone, Tag   string
		Rows, Upper []row
	}
	Objective row
}

type row struct {
	C [2]float64 `json:"c"`
	T [][]any    `json:"t"`
}

// coefficient is l x + k conj(x) on a column.
type coefficient struct {
	col  int
	l, k complex128
}

// decodeInstance reads an instance.
func decodeInstance(in io.Reader) (*model.Model, error) {
	var x instance
	if err := json.NewDecoder(in).Decode(&x); err != nil {
		return nil, err
	}
	d := decoder{m: &model.Model{Name: x.Name}, number: map[string]int{}}
	for k, v := range x.Vars {
		b := model.Block{Name: v.Name, Rows: v.Dim, Cols: 1}
		switch v.Kind {
		case "real":
		case "complex":
			b.Field = model.Complex
		case "hermitian":
			b.Field, b.Cols = model.Hermitian, v.Dim
		default:
			return nil, fmt.Errorf("block %s has the unknown kind %q", v.Name, v.Kind)
		}
		d.m.Blocks = append(d.m.Blocks, b)
		d.number[v.Name] = k
	}
	d.starts = d.m.Starts()
	if x.Sense == "max" {
		d.m.Objective.Sense = model.Maximize
	}
	d.m.Objective.Const = x.Objective.C[0]
	for _, c := range d.terms(x.Objective, false) {
		d.m.Objective.Col = append(d.m.Objective.Col, uint32(c.col))
		d.m.Objective.Coef = append(d.m.Objective.Coef, c.l+conj(c.k)) // the real part is taken
	}
	for _, c := range x.Cons {
		field, kind, ok := coneOf(c.Cone)
		if !ok {
			return nil, fmt.Errorf("constraint %s has the unknown cone %q", c.Tag, c.Cone)
		}
		rows := c.Rows
		if field.IsMatrix() && rows == nil {
			rows = c.Upper
		}
		d.m.Constraints = append(d.m.Constraints, d.constraint(c.Tag, field, kind, rows))
	}
	return d.m, d.m.Validate()
}

func coneOf(word string) (model.Field, model.ConeKind, bool) {
	switch word {
	case "zero_r":
		return model.Real, model.Zero, true
	case "zero_c":
		return model.Complex, model.Zero, true
	case "zero_h":
		return model.Hermitian, model.Zero, true
	case "nonneg":
		return model.Real, model.Nonneg, true
	case "soc_r":
		return model.Real, model.Lorentz, true
	case "soc_c":
		return model.Complex, model.Lorentz, true
	case "psd_r":
		return model.Symmetric, model.PSD, true
	case "psd_h":
		return model.Hermitian, model.PSD, true
	}
	return 0, 0, false
}

type decoder struct {
	m      *model.Model
	starts []int
	number map[string]int
}

func conj(c complex128) complex128 { return complex(real(c), -imag(c)) }

// terms decodes a row, or its conjugate, with columns rising.
func (d *decoder) terms(r row, conjugate bool) []coefficient {
	at := map[int]*coefficient{}
	for _, t := range r.T {
		name, starred := strings.CutSuffix(t[0].(string), "*")
		b := d.number[name]
		blk := &d.m.Blocks[b]
		var entry int
		if pair, ok := t[1].([]any); ok {
			i, j := int(pair[0].(float64)), int(pair[1].(float64))
			if i < j { // the upper triangle is the conjugate of the lower
				i, j, starred = j, i, !starred
			}
			entry = model.PackedIndex(blk.Rows, i, j)
		} else {
			entry = int(t[1].(float64))
		}
		c := complex(t[2].(float64), t[3].(float64))
		if conjugate {
			c, starred = conj(c), !starred
		}
		col := d.starts[b] + entry
		if at[col] == nil {
			at[col] = &coefficient{col: col}
		}
		if starred && !blk.RealEntry(entry) {
			at[col].k += c
		} else {
			at[col].l += c
		}
	}
	var out []coefficient
	for _, c := range at {
		out = append(out, *c)
	}
	slices.SortFunc(out, func(a, b coefficient) int { return cmp.Compare(a.col, b.col) })
	return out
}

// constraint decodes rows. The upper triangle row by row is the lower one column by column, conjugated: our packing.
func (d *decoder) constraint(name string, field model.Field, kind model.ConeKind, rows []row) model.Constraint {
	c := model.Constraint{Name: name, Cone: model.Cone{Kind: kind}, Map: model.Map{Field: field, Const: make([]complex128, len(rows))}}
	lin, cj := model.Matrix{Start: []int{0}, Z: []complex128{}}, model.Matrix{Start: []int{0}, Z: []complex128{}}
	c.Map.Lin.Start = make([]int, len(rows)+1) // RealRow asks for the number of rows
	put := func(m *model.Matrix, col int, v complex128) {
		if v != 0 {
			m.Col, m.Z = append(m.Col, uint32(col)), append(m.Z, v)
		}
	}
	for r := range rows {
		k := complex(rows[r].C[0], rows[r].C[1])
		if field.IsMatrix() {
			k = conj(k)
		}
		for _, x := range d.terms(rows[r], field.IsMatrix()) {
			if c.RealRow(r) {
				x.l, x.k = x.l+conj(x.k), 0
			}
			put(&lin, x.col, x.l)
			put(&cj, x.col, x.k)
		}
		if c.RealRow(r) {
			k = complex(real(k), 0)
		}
		c.Map.Const[r] = k
		lin.Start, cj.Start = append(lin.Start, len(lin.Col)), append(cj.Start, len(cj.Col))
	}
	c.Map.Lin = lin
	if len(cj.Col) > 0 {
		c.Map.Conj = &cj
	}
	return c
}
