package glpk

import (
	"fmt"
	"math"
	"strconv"

	"towpath/capability"
	"towpath/model"
)

// program is a linear program: minimize cost x subject to rowLower <= A x <= rowUpper and lower <= x <= upper, infinite
// where there is no limit.
type program struct {
	m                  *model.Model // that it was made from
	constant           float64
	cost, lower, upper []float64
	rowLower, rowUpper []float64
	start              []int // compressed rows of A
	column             []uint32
	value              []float64
	// With both limits infinite a row says nothing and is not sent. place is the row that a model's row became, -1
	// for none, constraint after constraint.
	place []int
}

// fromModel rewrites a model of the sheet's kinds.
func fromModel(m *model.Model) (*program, error) {
	p := &program{m: m, constant: m.Objective.Const, start: []int{0}}
	if m.Objective.Sense != model.Minimize {
		return nil, fmt.Errorf("glpk: drivers are given minimizations")
	}
	for b := range m.Blocks {
		blk := &m.Blocks[b]
		if blk.Field != model.Real || blk.Cone != model.Free && blk.Cone != model.Nonneg {
			return nil, fmt.Errorf("glpk: block %d is %s %s", b, blk.Field, blk.Cone)
		}
		for k := range blk.Entries() {
			lower, upper := math.Inf(-1), math.Inf(1)
			if blk.Bounds != nil {
				lower, upper = real(blk.Bounds.Lower[k]), real(blk.Bounds.Upper[k])
			}
			if blk.Cone == model.Nonneg {
				lower = max(lower, 0)
			}
			p.lower, p.upper = append(p.lower, lower), append(p.upper, upper)
		}
	}
	p.cost = make([]float64, len(p.lower))
	for k, c := range m.Objective.Col {
		p.cost[c] = real(m.Objective.Coef[k])
	}
	for k := range m.Constraints {
		if err := p.take(k); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// take adds the rows of constraint k.
func (p *program) take(k int) error {
	c := &p.m.Constraints[k]
	kind, _, _ := capability.MeasureMap(c)
	if c.Map.Field != model.Real || c.Map.Conj != nil {
		return fmt.Errorf("glpk: constraint %d is %s", k, kind)
	}
	for r := range c.Map.Rows() {
		lower, upper := 0.0, 0.0
		switch c.Cone.Kind {
		case model.Zero:
		case model.Nonneg:
			upper = math.Inf(1)
		case model.Range:
			lower, upper = real(c.Cone.Lower[r]), real(c.Cone.Upper[r])
		default:
			return fmt.Errorf("glpk: constraint %d is %s", k, kind)
		}
		if math.IsInf(lower, -1) && math.IsInf(upper, 1) {
			p.place = append(p.place, -1)
			continue
		}
		p.place = append(p.place, len(p.rowLower))
		x := real(c.Map.ConstAt(r))
		p.rowLower, p.rowUpper = append(p.rowLower, lower-x), append(p.rowUpper, upper-x)
		for q := c.Map.Lin.Start[r]; q < c.Map.Lin.Start[r+1]; q++ {
			if v := real(c.Map.Lin.At(q)); v != 0 {
				p.column, p.value = append(p.column, c.Map.Lin.Col[q]), append(p.value, v)
			}
		}
		p.start = append(p.start, len(p.column))
	}
	return nil
}

// text writes the program as free MPS. The rules that hold for every program of the trade are kept: each entry once, both
// bounds of a column always stated, no right-hand side on the objective, 17 digits.
func (p *program) text() []byte {
	var w writer
	w.add("NAME towpath\nROWS\n N c\n")
	for r := range p.rowLower {
		w.add(" ", rowKind(p.rowLower[r], p.rowUpper[r]), " r").count(r).add("\n")
	}
	w.add("COLUMNS\n")
	rows, values := p.byColumns()
	for j := range p.cost {
		w.add(" x").count(j).add(" c ").number(p.cost[j]).add("\n") // even when zero: it declares the column
		for q, r := range rows[j] {
			w.add(" x").count(j).add(" r").count(r).add(" ").number(values[j][q]).add("\n")
		}
	}
	w.add("RHS\n")
	for r, lower := range p.rowLower {
		side := lower
		if math.IsInf(lower, -1) {
			side = p.rowUpper[r]
		}
		if side != 0 {
			w.add(" b r").count(r).add(" ").number(side).add("\n")
		}
	}
	w.add("RANGES\n")
	for r, lower := range p.rowLower {
		if upper := p.rowUpper[r]; lower != upper && !math.IsInf(lower, -1) && !math.IsInf(upper, 1) {
			w.add(" s r").count(r).add(" ").number(upper - lower).add("\n")
		}
	}
	w.add("BOUNDS\n")
	for j := range p.cost {
		lower, upper := p.lower[j], p.upper[j]
		bound := func(kind string) *writer { return w.add(" ", kind, " l x").count(j) }
		switch {
		case lower == upper:
			bound("FX").add(" ").number(lower).add("\n")
			continue
		case math.IsInf(lower, -1) && math.IsInf(upper, 1):
			bound("FR").add("\n")
			continue
		case math.IsInf(lower, -1):
			bound("MI").add("\n")
		default:
			bound("LO").add(" ").number(lower).add("\n")
		}
		if !math.IsInf(upper, 1) {
			bound("UP").add(" ").number(upper).add("\n")
		}
	}
	return w.add("ENDATA\n").text
}

func rowKind(lower, upper float64) string {
	switch {
	case lower == upper:
		return "E"
	case math.IsInf(lower, -1):
		return "L"
	}
	return "G"
}

// byColumns turns compressed rows into columns, which is what the format wants.
func (p *program) byColumns() (rows [][]int, values [][]float64) {
	rows, values = make([][]int, len(p.cost)), make([][]float64, len(p.cost))
	for r := range p.rowLower {
		for q := p.start[r]; q < p.start[r+1]; q++ {
			j := p.column[q]
			rows[j], values[j] = append(rows[j], r), append(values[j], p.value[q])
		}
	}
	return rows, values
}

// writer gathers text.
type writer struct{ text []byte }

func (w *writer) add(words ...string) *writer {
	for _, s := range words {
		w.text = append(w.text, s...)
	}
	return w
}

func (w *writer) count(n int) *writer {
	w.text = strconv.AppendInt(w.text, int64(n), 10)
	return w
}

func (w *writer) number(x float64) *writer {
	w.text = strconv.AppendFloat(w.text, x, 'g', 17, 64)
	return w
}
