package bridges

import (
	"cmp"
	"slices"

	"towpath/model"
)

// writer gathers rows of coefficients and makes valid matrices of them: columns rise, repeated columns add up, exact
// zeros go, real entries have no conjugate, real rows have no conjugates at all.
type writer struct {
	d         *draft
	row       []coefficient
	lin, conj gathered
}

// coefficient is a x + b conj(x) on one column.
type coefficient struct {
	col  uint32
	a, b complex128
}

type gathered struct {
	start   []int
	col     []uint32
	z       []complex128
	complex bool
}

func newWriter(d *draft, rows int) *writer {
	w := &writer{d: d}
	w.reset(rows, 0)
	return w
}

// reset begins new matrices, with room for n coefficients. Matrices already taken are not touched.
func (w *writer) reset(rows, n int) {
	begin := func(n int) gathered {
		return gathered{start: append(make([]int, 0, rows+1), 0), col: make([]uint32, 0, n), z: make([]complex128, 0, n)}
	}
	w.lin, w.conj = begin(n), begin(0)
}

func (w *writer) add(col uint32, a, b complex128) {
	w.row = append(w.row, coefficient{col, a, b})
}

// addRow adds a row + b conj(row) for row j of a constraint.
func (w *writer) addRow(c *model.Constraint, j int, a, b complex128) {
	realRow := c.RealRow(j)
	visit := func(col uint32, l, k complex128) {
		if realRow { // the row is Re(l x + k conj x) = (g x + conj(g) conj(x))/2 with g = l + conj(k)
			g := l + conj(k)
			l, k = g/2, conj(g)/2
		}
		w.add(col, a*l+b*conj(k), a*k+b*conj(l))
	}
	m := &c.Map
	for p := m.Lin.Start[j]; p < m.Lin.Start[j+1]; p++ {
		visit(m.Lin.Col[p], m.Lin.At(p), 0)
	}
	if m.Conj != nil {
		for p := m.Conj.Start[j]; p < m.Conj.Start[j+1]; p++ {
			visit(m.Conj.Col[p], 0, m.Conj.At(p))
		}
	}
}

func (w *writer) endRow(realRow bool) {
	row := w.row
	byColumn := func(a, b coefficient) int { return cmp.Compare(a.col, b.col) }
	if !slices.IsSortedFunc(row, byColumn) {
		slices.SortStableFunc(row, byColumn)
	}
	for i := 0; i < len(row); {
		x := row[i]
		for i++; i < len(row) && row[i].col == x.col; i++ {
			x.a += row[i].a
			x.b += row[i].b
		}
		realColumn := w.d.realColumn(int(x.col))
		switch {
		case realRow:
			x.a, x.b = x.a+conj(x.b), 0
			if realColumn {
				x.a = complex(real(x.a), 0)
			}
		case realColumn:
			x.a, x.b = x.a+x.b, 0
		}
		w.lin.put(x.col, x.a)
		w.conj.put(x.col, x.b)
	}
	w.row = row[:0]
	w.lin.start = append(w.lin.start, len(w.lin.col))
	w.conj.start = append(w.conj.start, len(w.conj.col))
}

func (g *gathered) put(col uint32, v complex128) {
	if v == 0 {
		return
	}
	g.col, g.z = append(g.col, col), append(g.z, v)
	g.complex = g.complex || imag(v) != 0
}

func (g *gathered) matrix() model.Matrix {
	m := model.Matrix{Start: g.start, Col: g.col}
	if g.complex {
		m.Z = g.z
		return m
	}
	m.Re = make([]float64, len(g.z))
	for i, v := range g.z {
		m.Re[i] = real(v)
	}
	return m
}

// matrices takes what was written since the last reset.
func (w *writer) matrices() (lin model.Matrix, conj *model.Matrix) {
	if len(w.conj.col) > 0 {
		m := w.conj.matrix()
		conj = &m
	}
	return w.lin.matrix(), conj
}
