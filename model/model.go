package model

import "slices"

// Model is one optimization model. See the package comment for its meaning.
type Model struct {
	Name        string
	Blocks      []Block
	Objective   Objective
	Constraints []Constraint
}

// Block is a named group of decision variables.
type Block struct {
	Name  string // may be empty
	Field Field
	// Rows and Cols give the shape: a vector is Rows x 1, a general matrix Rows x Cols. For symmetric and
	// Hermitian matrices both are the order.
	Rows, Cols int
	Cone       ConeKind // Free, Nonneg, Lorentz or RotatedLorentz for real; Free for complex; Free or PSD for matrices
	Bounds     *Bounds  // nil: none
}

// Bounds limits the entries of a block: real parts limit the real part, imaginary parts the imaginary part.
// Infinite numbers mean no bound. Both lists have one number per entry.
type Bounds struct{ Lower, Upper []complex128 }

// Entries returns the number of entries (packed for symmetric and Hermitian matrices).
func (b *Block) Entries() int {
	if b.Field.IsMatrix() {
		return PackedLen(b.Rows)
	}
	return b.Rows * b.Cols
}

// RealEntry reports whether entry k of the block is a real number.
func (b *Block) RealEntry(k int) bool {
	switch b.Field {
	case Complex:
		return false
	case Hermitian:
		i, j := PackedAt(b.Rows, k)
		return i == j
	}
	return true
}

// Weight returns how often entry k counts in the inner product of the block: 2 off the diagonal of a
// symmetric or Hermitian matrix, else 1.
func (b *Block) Weight(k int) float64 {
	if b.Field.IsMatrix() {
		if i, j := PackedAt(b.Rows, k); i != j {
			return 2
		}
	}
	return 1
}

// Sense is the direction of optimization.
type Sense uint8

const (
	Minimize Sense = iota
	Maximize
)

// String returns the trade's word.
func (s Sense) String() string {
	if s == Maximize {
		return "maximize"
	}
	return "minimize"
}

// Objective is Re(sum_k Coef[k] x[Col[k]]) + Const; columns rise strictly.
type Objective struct {
	Sense Sense
	Col   []uint32
	Coef  []complex128
	Const float64
}

// Constraint is a map whose rows must lie in a cone.
type Constraint struct {
	Name string // may be empty
	Map  Map
	Cone Cone
}

// RealRow reports whether row r of the constraint is real (see the package comment).
func (c *Constraint) RealRow(r int) bool {
	switch c.Map.Field {
	case Complex:
		return r < c.Cone.Kind.heads()
	case Hermitian:
		n, _ := PackedOrder(c.Map.Rows())
		i, j := PackedAt(n, r)
		return i == j
	}
	return true
}

// Weight returns how often row r counts in the inner product of the constraint: 2 off the diagonal of a
// symmetric or Hermitian map, else 1.
func (c *Constraint) Weight(r int) float64 {
	if c.Map.Field.IsMatrix() {
		n, _ := PackedOrder(c.Map.Rows())
		if i, j := PackedAt(n, r); i != j {
			return 2
		}
	}
	return 1
}

// Starts returns the number of the first entry of every block, and at the end the number of all entries.
func (m *Model) Starts() []int {
	s := make([]int, len(m.Blocks)+1)
	for k := range m.Blocks {
		s[k+1] = s[k] + m.Blocks[k].Entries()
	}
	return s
}

// blockOf returns the block whose entries include the column; starts are those of Starts.
func blockOf(starts []int, col uint32) int {
	k, _ := slices.BinarySearch(starts, int(col)+1) // the first start beyond the column
	return k - 1
}
