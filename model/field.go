package model

// Field says over which numbers, and in which shape, a block's entries or a map's rows are taken.
type Field uint8

const (
	Real      Field = iota // real vector (or general real matrix, by columns)
	Complex                // complex vector (or general complex matrix, by columns)
	Symmetric              // real symmetric matrix, packed lower triangle by columns
	Hermitian              // complex Hermitian matrix, packed lower triangle by columns
)

// String returns the word used in kinds, logs and messages.
func (f Field) String() string {
	switch f {
	case Real:
		return "real"
	case Complex:
		return "complex"
	case Symmetric:
		return "symmetric"
	case Hermitian:
		return "hermitian"
	}
	return "unknown-field"
}

// IsMatrix reports whether the field lists a packed triangle.
func (f Field) IsMatrix() bool { return f == Symmetric || f == Hermitian }

// IsComplex reports whether entries may have an imaginary part.
func (f Field) IsComplex() bool { return f == Complex || f == Hermitian }

// PackedLen returns the number of packed entries of a symmetric or Hermitian matrix of the given order.
func PackedLen(order int) int { return order * (order + 1) / 2 }

// PackedOrder returns the order of the matrix with n packed entries; ok is false when there is none.
func PackedOrder(n int) (order int, ok bool) {
	if n < 0 {
		return 0, false
	}
	for order = isqrt(2 * n); PackedLen(order) > n; order-- {
	}
	return order, PackedLen(order) == n
}

// PackedIndex returns the position of row i, column j, i >= j, in the packed lower triangle of a matrix of the
// given order.
func PackedIndex(order, i, j int) int { return j*order - j*(j-1)/2 + i - j }

// PackedAt is the inverse of PackedIndex: the row and column of packed position k.
func PackedAt(order, k int) (i, j int) {
	// Counted from the end, columns are the triangular numbers.
	back := PackedLen(order) - 1 - k
	c := (isqrt(8*back+1) - 1) / 2
	j = order - 1 - c
	return k - PackedIndex(order, j, j) + j, j
}

// isqrt returns the integer square root of n >= 0 (Newton's iteration from above).
func isqrt(n int) int {
	if n < 2 {
		return n
	}
	x := n
	for y := (x + 1) / 2; y < x; y = (x + n/x) / 2 {
		x = y
	}
	return x
}
