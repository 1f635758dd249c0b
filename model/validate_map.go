package model

import (
	"fmt"
	"math"
	"slices"
)

// mapCones lists the cones that the rows of a map may lie in.
func mapCones(f Field) []ConeKind {
	switch f {
	case Real:
		return []ConeKind{Zero, Nonneg, Range, Lorentz, RotatedLorentz}
	case Complex:
		return []ConeKind{Zero, Range, Lorentz, RotatedLorentz}
	}
	return []ConeKind{Zero, PSD}
}

// onConjugates ends the place of a fault in Map.Conj, which people could not tell from one in Map.Lin otherwise.
const onConjugates = ", coefficients on conjugates"

func (v *validator) constraint(path, place string, c *Constraint) {
	f := &c.Map
	if f.Field > Hermitian {
		v.fault(path+".field", place, fmt.Sprintf("field number %d is unknown", f.Field), "use real, complex, symmetric or hermitian")
		return
	}
	if c.Cone.Kind > Box {
		v.fault(path+".cone", place, fmt.Sprintf("cone number %d is unknown", c.Cone.Kind), "use zero, nonneg, range, lorentz, rotated-lorentz or psd")
		return
	}
	if !slices.Contains(mapCones(f.Field), c.Cone.Kind) {
		v.fault(path+".cone", place, fmt.Sprintf("%s rows cannot lie in the cone %s", f.Field, c.Cone.Kind),
			"real rows may be in zero, nonneg, range, lorentz or rotated-lorentz, complex ones in zero, range, lorentz or rotated-lorentz, matrices in zero or psd")
		return
	}
	n := f.Rows()
	if n == 0 {
		v.fault(path+".map", place, "it has no rows", "leave it out, or give it rows")
		return
	}
	if f.Field.IsMatrix() {
		if _, ok := PackedOrder(n); !ok {
			v.fault(path+".map", place, fmt.Sprintf("%d rows are not the lower triangle of a matrix", n), "give order*(order+1)/2 rows")
			return
		}
	}
	if c.Cone.Kind == RotatedLorentz && n < 2 {
		v.fault(path+".map", place, "a rotated lorentz cone has at least 2 rows", "give u, v and the rest")
		return
	}
	sound := v.matrix(path+".map.lin", place, &f.Lin, n)
	if f.Conj != nil {
		if f.Conj.Rows() != n {
			v.fault(path+".map.conj", place, fmt.Sprintf("it has %d rows of coefficients and %d of coefficients on conjugates", n, f.Conj.Rows()), "give as many of both")
			return
		}
		sound = v.matrix(path+".map.conj", place+onConjugates, f.Conj, n) && sound
	}
	if f.Const != nil && len(f.Const) != n {
		v.fault(path+".map.const", place, fmt.Sprintf("it has %d constants for %d rows", len(f.Const), n), "give one per row, or none")
		return
	}
	v.sides(path, place, c, n)
	if sound {
		for r := range n {
			v.row(path, place, c, r)
		}
	}
}

// matrix checks the skeleton of compressed rows, so that rows can be walked.
func (v *validator) matrix(path, place string, m *Matrix, n int) bool {
	bad := func(problem, cure string) bool {
		v.fault(path, place, problem, cure)
		return false
	}
	if m.Start[0] != 0 || m.Start[n] != len(m.Col) {
		return bad(fmt.Sprintf("its row starts run from %d to %d for %d coefficients", m.Start[0], m.Start[n], len(m.Col)), "begin with 0 and end with the number of coefficients")
	}
	for r := range n {
		if m.Start[r+1] < m.Start[r] {
			return bad(fmt.Sprintf("row %d begins at %d and ends at %d", r, m.Start[r], m.Start[r+1]), "give row starts that never fall")
		}
	}
	if m.Re != nil && m.Z != nil {
		return bad("it has real and complex values", "give one of the two")
	}
	if have := max(len(m.Re), len(m.Z)); have != len(m.Col) {
		return bad(fmt.Sprintf("it has %d columns and %d values", len(m.Col), have), "give one value per column")
	}
	return true
}

func (v *validator) row(path, place string, c *Constraint, r int) {
	at := fmt.Sprintf("%s, row %d", place, r)
	realRow := c.RealRow(r)
	f := &c.Map
	for p := f.Lin.Start[r]; p < f.Lin.Start[r+1]; p++ {
		if !v.column(path+".map.lin", at, f.Lin.Col, p, f.Lin.Start[r]) {
			return
		}
		v.coefficient(path+".map.lin", at, f.Lin.Col[p], f.Lin.At(p), realRow)
	}
	if f.Conj != nil {
		at := at + onConjugates
		for p := f.Conj.Start[r]; p < f.Conj.Start[r+1]; p++ {
			if !v.column(path+".map.conj", at, f.Conj.Col, p, f.Conj.Start[r]) {
				return
			}
			col := f.Conj.Col[p]
			if v.realColumn(col) {
				v.fault(path+".map.conj", at, fmt.Sprintf("%s is real and has a coefficient on its conjugate", v.entryName(col)), "add it to the plain coefficient")
				return
			}
			v.coefficient(path+".map.conj", at, col, f.Conj.At(p), realRow)
		}
	}
	x := f.ConstAt(r)
	if !isFinite(x) {
		v.fault(path+".map.const", at, fmt.Sprintf("the constant is %v", x), "send finite numbers")
		return
	}
	if realRow && !rounding(x) {
		what := "the row is real and its constant has an imaginary part"
		if f.Field == Hermitian {
			what = "the row is on the diagonal of a Hermitian matrix and its constant has an imaginary part"
		}
		v.fault(path+".map.const", at, what, "make the constant real")
	}
}

// sides checks the limits of range rows, and that nothing else has limits.
func (v *validator) sides(path, place string, c *Constraint, n int) {
	if c.Cone.Kind != Range {
		if c.Cone.Lower != nil || c.Cone.Upper != nil {
			v.fault(path+".cone", place, fmt.Sprintf("it has limits but lies in the cone %s", c.Cone.Kind), "leave the limits out, or use the cone range")
		}
		return
	}
	if len(c.Cone.Lower) != n || len(c.Cone.Upper) != n {
		v.fault(path+".cone", place, fmt.Sprintf("it has %d lower and %d upper limits for %d rows", len(c.Cone.Lower), len(c.Cone.Upper), n), "give one of each per row, infinite where there is none")
		return
	}
	for r := range n {
		at := fmt.Sprintf("%s, row %d", place, r)
		lo, up := c.Cone.Lower[r], c.Cone.Upper[r]
		v.limits(path+".cone", at, lo, up, c.Map.Field == Real)
		open := math.IsInf(real(lo), -1) && math.IsInf(real(up), 1)
		if c.Map.Field == Complex {
			open = open && math.IsInf(imag(lo), -1) && math.IsInf(imag(up), 1)
		}
		if open {
			v.fault(path+".cone", at, "it has neither a lower nor an upper limit", "leave the row out")
		}
	}
}
