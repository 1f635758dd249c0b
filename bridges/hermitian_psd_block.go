package bridges

import (
	"cmp"
	"slices"

	"towpath/capability"
	"towpath/model"
)

// embedding is the source of both bridges from Hermitian to symmetric matrices. Valid because
// T(H) = [[Re H, -Im H], [Im H, Re H]] has every eigenvalue of H twice: (x + i y) is an eigenvector of H when (x, y) and
// (-y, x) are of T(H).
const embedding = "M. X. Goemans and D. P. Williamson, J. Comput. System Sci. 68 (2004), section 2 (from memory)"

// hermitianPSDBlock writes a Hermitian block of order n as a symmetric one of order 2n, with Z in n x n quarters:
//
//	H = 1/2 [(Z11 + Z22) + i (Z21 - Z12)]
//
// No rows force the quarters to match: data enter as T(A)/2, which any unmatched part does not meet, and the average of a
// positive semidefinite Z over the quarters is positive semidefinite. Values come back by the formula, never from one
// quarter alone, which is off by the solver's error. <T(A)/2, T(B)> = <A, B>, so multipliers stay as they are.
// Toll: order 2n; no rows. (Rows that force the quarters to match would be n(n+1) more.)
type hermitianPSDBlock struct{ rule }

func newHermitianPSDBlock() Bridge {
	return hermitianPSDBlock{rule{"hermitian-psd-block/real-2n", blockKind(model.Hermitian, model.PSD), embedding}}
}

func (hermitianPSDBlock) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(blockKind(model.Symmetric, model.PSD), 2*n), true
}

func (hermitianPSDBlock) Lower(it Item) Lowering {
	n := it.Block.Rows
	type coefficient struct {
		at int
		c  complex128
	}
	t := newTable()
	for k := range it.Block.Entries() {
		i, j := model.PackedAt(n, k) // i >= j
		row := []coefficient{
			{model.PackedIndex(2*n, i, j), 0.5},
			{model.PackedIndex(2*n, n+i, n+j), 0.5},
		}
		if i != j {
			row = append(row,
				coefficient{model.PackedIndex(2*n, n+i, j), 0.5i},  // Z21[i,j]
				coefficient{model.PackedIndex(2*n, n+j, i), -0.5i}) // Z12[i,j] = Z21[j,i]
		}
		slices.SortFunc(row, func(a, b coefficient) int { return cmp.Compare(a.at, b.at) })
		for _, x := range row {
			t.add(x.at, x.c)
		}
		t.end()
	}
	return Lowering{Blocks: []model.Block{matrixBlock(model.Symmetric, 2*n, model.PSD)}, Values: t.combination()}
}
