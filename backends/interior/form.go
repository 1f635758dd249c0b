package interior

import (
	"math"

	"towpath/model"
)

// form is a model in orthonormal real coordinates, complex entries and rows as two coordinates each:
//
//	minimize  c_u' u + sum <c_X, X>  subject to  A X + B u = b,  F u + f = S,  X and S in cones
//
// u are the entries of free blocks. Blocks in cones are X. A map in a cone that uses free entries only is F u + f; one that
// uses entries of cone blocks, too, gets a slack of its own among the X. The reduced unknowns of the engine are the
// multipliers y of the rows of A, then u.
type form struct {
	m        *model.Model
	starts   []int        // first entry of every block
	entries  []coordinate // of every entry of the model
	where    []place      // of every constraint
	rows     int
	free     int
	b, cu    []float64
	bu       []sparse // rows of B
	items    []*item
	constant float64
	rowScale []float64 // rows were divided by this
}

// coordinate says where an entry is: in u when item is negative, else in that item.
type coordinate struct {
	item, at int
	real     bool
	root     float64 // square root of the weight
}

// place says where a constraint went: into rows, or into the map item, or into both with the item as slack.
type place struct {
	item int // -1 for none
	rows int // first row, -1 for none
}

// compile turns a model of native kinds into the standard form.
func compile(m *model.Model) *form {
	f := &form{m: m, starts: m.Starts(), constant: m.Objective.Const}
	f.addBlocks()
	f.addObjective()
	for k := range m.Constraints {
		f.where = append(f.where, f.addConstraint(&m.Constraints[k]))
	}
	for _, it := range f.items {
		it.finish(f.rows)
	}
	f.scaleRows()
	return f
}

func (f *form) addItem(c cone, isBlock bool) int {
	f.items = append(f.items, &item{cone: c, isBlock: isBlock, given: map[int]*sparse{}, offset: make([]float64, c.dim())})
	return len(f.items) - 1
}

func (f *form) addBlocks() {
	for k := range f.m.Blocks {
		b := &f.m.Blocks[k]
		it, at := -1, f.free
		switch b.Cone {
		case model.Nonneg:
			it = f.addItem(&orthant{n: b.Entries()}, true)
		case model.Lorentz:
			it = f.addItem(newLorentz(b.Entries()), true)
		case model.PSD:
			it = f.addItem(newPSD(b.Rows, b.Field == model.Hermitian), true)
		}
		if it >= 0 {
			at = 0
		}
		for e := range b.Entries() {
			c := coordinate{it, at, b.RealEntry(e), math.Sqrt(b.Weight(e))}
			f.entries = append(f.entries, c)
			at += c.width()
		}
		if it < 0 {
			f.free = at
		}
	}
	f.cu = make([]float64, f.free)
}

func (c coordinate) width() int {
	if c.real {
		return 1
	}
	return 2
}

func (f *form) addObjective() {
	for k, col := range f.m.Objective.Col {
		e := f.entries[col]
		c := f.m.Objective.Coef[k]
		into := f.cu
		if e.item >= 0 {
			into = f.items[e.item].offset
		}
		into[e.at] += real(c) / e.root
		if !e.real {
			into[e.at+1] -= imag(c) / e.root
		}
	}
}

// line is one real row of a constraint, as coefficients on coordinates.
type line struct {
	at     []coordinate
	v      []float64
	offset float64
}

// add puts the part (0 real, 1 imaginary) of l x + k conj(x) for entry x, times w.
func (n *line) add(x coordinate, l, k complex128, part int, w float64) {
	// on (Re x, Im x): real part (l+k, i(l-k)), imaginary part likewise
	a, b := l+k, 1i*(l-k)
	re, im := real(a), real(b)
	if part == 1 {
		re, im = imag(a), imag(b)
	}
	w /= x.root
	if re != 0 {
		n.at, n.v = append(n.at, x), append(n.v, re*w)
	}
	if !x.real && im != 0 {
		x.at++
		n.at, n.v = append(n.at, x), append(n.v, im*w)
	}
}

// lines writes a constraint's rows as real ones in orthonormal coordinates.
func (f *form) lines(c *model.Constraint) []line {
	var out []line
	m := &c.Map
	for r := range m.Rows() {
		w := math.Sqrt(c.Weight(r))
		width := 2
		if c.RealRow(r) {
			width = 1
		}
		for part := range width {
			var n line
			for p := m.Lin.Start[r]; p < m.Lin.Start[r+1]; p++ {
				n.add(f.entries[m.Lin.Col[p]], m.Lin.At(p), 0, part, w)
			}
			if m.Conj != nil {
				for p := m.Conj.Start[r]; p < m.Conj.Start[r+1]; p++ {
					n.add(f.entries[m.Conj.Col[p]], 0, m.Conj.At(p), part, w)
				}
			}
			n.offset = real(m.ConstAt(r)) * w
			if part == 1 {
				n.offset = imag(m.ConstAt(r)) * w
			}
			out = append(out, n)
		}
	}
	return out
}

func (f *form) addConstraint(c *model.Constraint) place {
	lines := f.lines(c)
	slack := false
	for _, n := range lines {
		for _, x := range n.at {
			slack = slack || x.item >= 0
		}
	}
	at := place{-1, -1}
	switch c.Cone.Kind {
	case model.Nonneg:
		at.item = f.addItem(&orthant{n: len(lines)}, slack)
	case model.Lorentz:
		at.item = f.addItem(newLorentz(len(lines)), slack)
	case model.PSD:
		n, _ := model.PackedOrder(c.Map.Rows())
		at.item = f.addItem(newPSD(n, c.Map.Field == model.Hermitian), slack)
	}
	if at.item >= 0 && !slack {
		it := f.items[at.item]
		for k, n := range lines {
			it.offset[k] = n.offset
			for i, x := range n.at {
				it.put(-1-x.at, k, n.v[i]) // free columns are numbered behind the rows in the end
			}
		}
		return at
	}
	at.rows = f.rows
	for k, n := range lines {
		var free sparse
		for i, x := range n.at {
			if x.item < 0 {
				free.put(x.at, n.v[i])
			} else {
				f.items[x.item].put(f.rows, x.at, n.v[i])
			}
		}
		if at.item >= 0 {
			f.items[at.item].put(f.rows, k, -1)
		}
		f.bu = append(f.bu, free.compact())
		f.b = append(f.b, -n.offset)
		f.rows++
	}
	return at
}

// scaleRows divides every equality row by its norm.
func (f *form) scaleRows() {
	square := make([]float64, f.rows)
	for r := range f.bu {
		square[r] += dot(f.bu[r].v, f.bu[r].v)
	}
	each := func(do func(row int, s *sparse)) {
		for _, it := range f.items {
			if it.isBlock {
				for i, row := range it.keys {
					do(row, &it.data[i])
				}
			}
		}
	}
	each(func(row int, s *sparse) { square[row] += dot(s.v, s.v) })
	f.rowScale = make([]float64, f.rows)
	for r := range f.rowScale {
		f.rowScale[r] = 1
		if square[r] > 0 {
			f.rowScale[r] = math.Sqrt(square[r])
		}
		f.bu[r].divide(f.rowScale[r])
		f.b[r] /= f.rowScale[r]
	}
	each(func(row int, s *sparse) { s.divide(f.rowScale[row]) })
}
