package model

// Matrix is a sparse matrix in compressed rows. Row r has the positions Start[r] to Start[r+1] of Col and of
// the values; within a row columns rise strictly. Exactly one of Re and Z holds values: Re when the matrix is
// real, Z when it is complex. A matrix without entries may have neither.
type Matrix struct {
	Start []int // one more than rows; Start[0] is 0
	Col   []uint32
	Re    []float64
	Z     []complex128
}

// Rows returns the number of rows.
func (m *Matrix) Rows() int {
	if len(m.Start) == 0 {
		return 0
	}
	return len(m.Start) - 1
}

// Nonzeros returns the number of stored coefficients.
func (m *Matrix) Nonzeros() int { return len(m.Col) }

// IsReal reports whether the values are stored as real numbers.
func (m *Matrix) IsReal() bool { return m.Z == nil }

// At returns the value at position p, Start[r] <= p < Start[r+1].
func (m *Matrix) At(p int) complex128 {
	if m.Z != nil {
		return m.Z[p]
	}
	return complex(m.Re[p], 0)
}

// Map is an affine map from the entries of a model to rows:
//
//	row_r(x) = sum_j Lin[r,j] x_j + sum_j Conj[r,j] conj(x_j) + Const[r]
//
// with the real part taken where a row is real (see the package comment).
type Map struct {
	Field Field
	Lin   Matrix
	Conj  *Matrix      // nil when no conjugate is used; same number of rows as Lin
	Const []complex128 // nil means zero
}

// Rows returns the number of rows.
func (f *Map) Rows() int { return f.Lin.Rows() }

// Nonzeros returns the number of stored coefficients.
func (f *Map) Nonzeros() int {
	n := f.Lin.Nonzeros()
	if f.Conj != nil {
		n += f.Conj.Nonzeros()
	}
	return n
}

// ConstAt returns the constant of row r.
func (f *Map) ConstAt(r int) complex128 {
	if f.Const == nil {
		return 0
	}
	return f.Const[r]
}
