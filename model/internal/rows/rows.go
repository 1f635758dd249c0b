// Package rows gathers the coefficients of a constraint in any order and makes compressed rows of them.
package rows

import (
	"cmp"
	"slices"

	"towpath/model"
)

// Rows is a map under construction. Coefficients on the same entry in the same row add up.
type Rows struct {
	field  model.Field
	lin    []term
	conj   []term
	consts []complex128
}

type term struct {
	row  int
	col  uint32
	coef complex128
}

// New starts a map with the given number of rows (packed, for matrices), all of them zero.
func New(field model.Field, rows int) *Rows {
	return &Rows{field: field, consts: make([]complex128, rows)}
}

// Add adds coef times the entry to the row.
func (r *Rows) Add(row, entry int, coef complex128) {
	r.lin = append(r.lin, term{row, uint32(entry), coef})
}

// AddConj adds coef times the conjugate of the entry to the row.
func (r *Rows) AddConj(row, entry int, coef complex128) {
	r.conj = append(r.conj, term{row, uint32(entry), coef})
}

// Const adds a constant to the row.
func (r *Rows) Const(row int, c complex128) { r.consts[row] += c }

// In finishes the map as a constraint.
func (r *Rows) In(kind model.ConeKind, name string) model.Constraint {
	m := model.Map{Field: r.field, Lin: compress(r.lin, len(r.consts))}
	if slices.ContainsFunc(r.consts, func(c complex128) bool { return c != 0 }) {
		m.Const = r.consts
	}
	if len(r.conj) > 0 {
		c := compress(r.conj, len(r.consts))
		m.Conj = &c
	}
	return model.Constraint{Name: name, Map: m, Cone: model.Cone{Kind: kind}}
}

// compress sorts by row and column, adds up what falls together and drops what is exactly zero. The matrix is real
// when all its numbers are.
func compress(terms []term, n int) model.Matrix {
	slices.SortStableFunc(terms, func(a, b term) int {
		return cmp.Or(cmp.Compare(a.row, b.row), cmp.Compare(a.col, b.col))
	})
	m := model.Matrix{Start: make([]int, n+1)}
	real64 := true
	for k := 0; k < len(terms); {
		t := terms[k]
		for k++; k < len(terms) && terms[k].row == t.row && terms[k].col == t.col; k++ {
			t.coef += terms[k].coef
		}
		if t.coef == 0 {
			continue
		}
		m.Col = append(m.Col, t.col)
		m.Z = append(m.Z, t.coef)
		m.Start[t.row+1]++
		real64 = real64 && imag(t.coef) == 0
	}
	for i := range n {
		m.Start[i+1] += m.Start[i]
	}
	if real64 {
		for _, z := range m.Z {
			m.Re = append(m.Re, real(z))
		}
		m.Z = nil
	}
	return m
}
