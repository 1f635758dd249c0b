package csdp

import (
	"bytes"
	"fmt"
	"math"
	"strconv"

	"towpath/model"
)

// problem is a model in csdp's terms, and the way back.
type problem struct {
	m          *model.Model
	inequality bool
	a          []float64     // right-hand sides of the left side, costs of the right side
	blocks     []block       // in the order of the file
	where      []int         // file row of every row (column) of the model, -1 for those left out
	settled    *model.Answer // when nothing is left to solve
}

// block is one matrix block of the file: order of a matrix, or length of a diagonal.
type block struct {
	size     int
	diagonal bool
	entries  []entry
}

// entry is one number of matrix number of (0 for C, i for A_i) in the upper triangle, 1-based.
type entry struct {
	of, i, j int
	v        float64
}

// largest is the largest number that csdp is given: it takes 3e308 for infinity and calls the problem infeasible.
const largest = 1e100

// noise is the largest constant of a row without coefficients, and the largest cost of a column in no constraint, that is
// taken for zero: arithmetic on numbers of order one leaves that much. Leaving such a row out misses it by no more, while
// a certificate of its contradiction would be of size 1/noise, which proves nothing.
const noise = 1e-12

// fromEquality writes min c.x, A x = b, x in cones: C = -c, a = b, and csdp's y is minus ours. A coefficient on an
// off-diagonal entry is halved, because tr(A X) counts it twice.
func fromEquality(m *model.Model) (*problem, error) {
	p := &problem{m: m}
	starts := m.Starts()
	owner := make([]int, starts[len(m.Blocks)])
	for k := range m.Blocks {
		b := &m.Blocks[k]
		p.blocks = append(p.blocks, block{size: b.Rows * b.Cols, diagonal: true})
		if b.Field.IsMatrix() {
			p.blocks[k] = block{size: b.Rows}
		}
		for e := starts[k]; e < starts[k+1]; e++ {
			owner[e] = k
		}
	}
	put := func(of int, col uint32, v float64) error {
		k := owner[col]
		i, j := p.place(k, int(col)-starts[k])
		if i != j {
			v /= 2
		}
		return p.blocks[k].put(of, i, j, v)
	}
	for k, col := range m.Objective.Col {
		if err := put(0, col, -real(m.Objective.Coef[k])); err != nil {
			return nil, err
		}
	}
	for k := range m.Constraints {
		c := &m.Constraints[k]
		for r := range c.Map.Rows() {
			b := -real(c.Map.ConstAt(r))
			empty := true // csdp refuses empty rows, and rows of zeros are empty to it
			for x := c.Map.Lin.Start[r]; x < c.Map.Lin.Start[r+1]; x++ {
				v := real(c.Map.Lin.At(x))
				empty = empty && v == 0
				if err := put(len(p.a)+1, c.Map.Lin.Col[x], v); err != nil {
					return nil, err
				}
			}
			switch {
			case math.IsNaN(b - b), !empty && math.Abs(b) > largest:
				return nil, tooLarge(b)
			case empty:
				p.where = append(p.where, -1)
				if math.Abs(b) > noise && p.settled == nil {
					p.settled = p.contradiction(len(p.where)-1, b)
				}
			default:
				p.a = append(p.a, b)
				p.where = append(p.where, len(p.a)-1)
			}
		}
	}
	return p, p.needRows()
}

// fromInequality writes min c'u, F(u) in cones: a = c, A_i = F_i, C = -F(0); csdp's y is u and its X the multipliers.
func fromInequality(m *model.Model) (*problem, error) {
	p := &problem{m: m, inequality: true}
	n := m.Starts()[len(m.Blocks)]
	cost := make([]float64, n)
	for k, col := range m.Objective.Col {
		cost[col] = real(m.Objective.Coef[k])
	}
	used := make([]bool, n)
	for k := range m.Constraints {
		lin := &m.Constraints[k].Map.Lin
		for x, col := range lin.Col {
			used[col] = used[col] || real(lin.At(x)) != 0
		}
	}
	for col := range n {
		switch c := cost[col]; {
		case math.IsNaN(c - c), used[col] && math.Abs(c) > largest:
			return nil, tooLarge(c)
		case !used[col]: // csdp refuses empty rows, and rows of zeros are empty to it
			p.where = append(p.where, -1)
			if math.Abs(c) > noise && p.settled == nil {
				p.settled = p.slide(col, c)
			}
		default:
			p.a = append(p.a, c)
			p.where = append(p.where, len(p.a)-1)
		}
	}
	for k := range m.Constraints {
		c := &m.Constraints[k]
		rows := c.Map.Rows()
		p.blocks = append(p.blocks, block{size: rows, diagonal: true})
		if c.Map.Field.IsMatrix() {
			order, _ := model.PackedOrder(rows)
			p.blocks[k] = block{size: order}
		}
		for r := range rows {
			i, j := p.place(k, r)
			if err := p.blocks[k].put(0, i, j, -real(c.Map.ConstAt(r))); err != nil {
				return nil, err
			}
			for x := c.Map.Lin.Start[r]; x < c.Map.Lin.Start[r+1]; x++ {
				if err := p.blocks[k].put(p.where[c.Map.Lin.Col[x]]+1, i, j, real(c.Map.Lin.At(x))); err != nil {
					return nil, err
				}
			}
		}
	}
	return p, p.needRows()
}

func (p *problem) needRows() error {
	if len(p.a) == 0 && p.settled == nil {
		return fmt.Errorf("csdp needs at least one row that is not empty; use another sheet")
	}
	return nil
}

func tooLarge(v float64) error {
	return fmt.Errorf("csdp is not given numbers beyond %g, and the model has %g; scale it", largest, v)
}

// place gives the 1-based upper-triangle position of a packed entry or row.
func (p *problem) place(k, at int) (i, j int) {
	if p.blocks[k].diagonal {
		return at + 1, at + 1
	}
	row, col := model.PackedAt(p.blocks[k].size, at)
	return col + 1, row + 1
}

func (b *block) put(of, i, j int, v float64) error {
	if !(math.Abs(v) <= largest) {
		return tooLarge(v)
	}
	if v != 0 {
		b.entries = append(b.entries, entry{of, i, j, v})
	}
	return nil
}

// text writes SDPA sparse: every entry once, upper triangle, 17 digits.
func (p *problem) text() []byte {
	var w bytes.Buffer
	fmt.Fprintf(&w, "%d\n%d\n", len(p.a), len(p.blocks))
	for _, b := range p.blocks {
		if b.diagonal {
			fmt.Fprintf(&w, "-%d ", b.size)
		} else {
			fmt.Fprintf(&w, "%d ", b.size)
		}
	}
	w.WriteByte('\n')
	for _, v := range p.a {
		w.WriteString(strconv.FormatFloat(v, 'g', 17, 64))
		w.WriteByte(' ')
	}
	w.WriteByte('\n')
	// entries by matrix, then by block
	lines := make([]bytes.Buffer, len(p.a)+1)
	for k, b := range p.blocks {
		for _, e := range b.entries {
			l := &lines[e.of]
			fmt.Fprintf(l, "%d %d %d %d ", e.of, k+1, e.i, e.j)
			l.WriteString(strconv.FormatFloat(e.v, 'g', 17, 64))
			l.WriteByte('\n')
		}
	}
	for i := range lines {
		w.Write(lines[i].Bytes())
	}
	return w.Bytes()
}
