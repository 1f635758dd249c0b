// Package model holds an optimization model in memory, as its field writes it, and the answers to it.
//
// # The model
//
//	minimize (or maximize)  Re(c^T x) + constant
//	subject to              F_k(x) in K_k             one constraint per k
//	                        x_b in K_b                a block may have a cone of its own
//	                        lower_b <= x_b <= upper_b on real and imaginary part separately
//
// x is the list of all entries, block after block in the order of Model.Blocks. Every map F_k is affine over
// the reals: a complex row may use an entry and the entry's conjugate.
//
// # Entries
//
// A vector lists its entries in order, a general matrix by columns. Symmetric and Hermitian matrices list the
// lower triangle by columns (LAPACK packed 'L' order): (0,0), (1,0), ..., (n-1,0), (1,1), (2,1), ... The entry in
// row i and column j, i >= j, stands for the pair (i,j), (j,i): the upper one is its conjugate. Diagonal entries
// of Hermitian matrices are real. Matrix-valued maps list their rows in the same order.
//
// # Real rows
//
// Rows of real and symmetric maps, the diagonal rows of Hermitian maps, and the head rows of complex lorentz
// (one) and rotated lorentz (two) maps are real: they mean the real part of what their coefficients say. On a
// complex entry a coefficient a+bi therefore contributes a Re(x) - b Im(x). Where a real row meets a real entry, and in
// the constants of real rows, an imaginary part of rounding size is ignored and a larger one is a fault.
//
// # Inner products
//
// <a,b> = Re(conj(a) b), summed over entries or rows; for symmetric and Hermitian matrices
// <A,B> = Re tr(A^H B), so packed off-diagonal entries count twice (Weight). Under these products nonneg,
// lorentz, rotated lorentz (2 u v >= ||w||^2) and the positive semidefinite cones are their own duals.
//
// # Multipliers and signs
//
// Multipliers belong to the minimization form: with f0 the objective, or minus the objective of a
// maximization, the Lagrangian is
//
//	L = f0(x) - sum_k <y_k, F_k(x)> - sum_b <z_b, x_b> - sum_b <s_b, x_b>
//
// and y_k lies in the dual cone of K_k: anything for zero, K_k itself for the self-dual cones. For a range
// row (and for bounds, z_b) the multiplier is that of the lower side minus that of the upper side, the real and
// the imaginary part each for their own. s_b is the multiplier of the block's own cone; it is never stored,
// because stationarity determines it: s_b = c_b - (F^* y)_b - z_b.
//
// y_k has the field and the rows of its constraint. For a Hermitian constraint it is the Hermitian matrix Y with
// <Y, F> = Re tr(Y F), packed like F.
//
// The dual objective of a minimization, a lower bound on it where the multipliers are exact, is
//
//	constant - sum_k <y_k, F_k(0)> + sum over range rows and bounds of (lower y^+ - upper y^-),
//
// where bounds of off-diagonal entries of matrices count twice, as in <z_b, x_b>.
//
// # Certificates
//
// Infeasibility is certified by multipliers y, z, each in its dual cone, for which -(F^* y)_b - z_b lies in the
// dual cone of every block (is zero for a free block) while the dual objective, taken without the objective's
// constant, is positive. Unboundedness is certified by a ray x whose linear image F_k(x) - F_k(0) lies in the
// recession cone of every K_k, x_b in K_b and in the recession cone of the bounds, with f0(x) - f0(0) negative.
package model
