package capability

import "towpath/model"

// Rates turn the counts of InteriorToll into seconds and bytes. A driver fills them in from measurements of its solver and
// says where and when they were made. Every rate but Flops may be zero; none may be negative, or tolls would fall as
// loads grow.
type Rates struct {
	Start       float64 // seconds for anything at all: starting a process, reading
	Coefficient float64 // seconds per number of a block that is written to and read from another process
	Iterations  float64
	Flops       float64 // per second, in products of matrices

	// Matrix counts the flops that a real matrix of order n costs in every iteration, divided by the cube of n: its
	// factorisation, the scaling, the step lengths, the products of direction and corrector.
	Matrix float64
	// ComplexCore says that symmetric matrices are worked on as complex ones.
	ComplexCore bool
	// Scalar counts the flops per iteration of one real coordinate of a cone beside those of Matrix: memory, bookkeeping, loops
	// too short to be fast.
	Scalar float64
	// Product counts flops per unknown and cubed order of the largest matrix: how often a dense coefficient matrix is
	// multiplied. Where coefficients are sparse, it is small.
	Product float64
	// Entry counts flops per unknown and real coordinate of all cones: how the reduced system is filled when
	// coefficients are sparse.
	Entry float64
	// Pair counts flops per pair of unknowns, beside the factorisation.
	Pair float64
	// Factor counts flops per cube of the unknowns in the factorisation; 0 means a third, that of a dense one.
	Factor float64

	Bytes    float64 // for anything at all
	Copies   float64 // of the reduced system
	Matrices float64 // of the order of every block, held at a time
}

// Counts of the textbooks (Golub and Van Loan, Matrix Computations, from memory).
const (
	complexFlops  = 4.0       // a complex multiplication and addition is 8 real flops, a real one 2
	choleskyFlops = 1.0 / 3.0 // per cubed order, real
	bytesPerReal  = 8.0
)

// InteriorToll predicts what an interior-point solver takes for a load: iterations times (the cubes of all matrix orders +
// filling the reduced system + a third of the cube of its order). The reduced system has one unknown per real row and per
// real free coordinate. The sizes say nothing of how sparse the coefficients are: Product and Entry stand for what is usual.
//
// It does not fall when a size or a count grows, and it mounts (see Sheet). A Hermitian matrix of order n costs half of a
// symmetric one of order 2n, 4 n^3 against 8 n^3, and holds half the bytes; unknowns are the same, so the factorisation
// gains nothing.
func InteriorToll(l Load, r Rates) Toll {
	var cubes, coordinates, squares, largest, unknowns float64
	for _, d := range l {
		n, count := float64(d.Size), float64(d.Count)
		switch d.Kind.Cone {
		case model.Zero, model.Free:
			unknowns += count * realCoordinates(d.Kind, n)
		case model.PSD:
			weight, width := 1.0, 1.0
			if d.Kind.Field == model.Hermitian || r.ComplexCore {
				weight, width = complexFlops, 2
			}
			cubes += count * weight * n * n * n
			squares += count * width * n * n
			largest = max(largest, weight*n*n*n)
		default:
			coordinates += count * realCoordinates(d.Kind, n)
		}
	}
	const matrixEntry = 0.5 // a Hermitian matrix has as many real coordinates as half its numbers
	factor := r.Factor
	if factor == 0 {
		factor = choleskyFlops
	}
	work := r.Matrix*cubes + r.Scalar*(coordinates+matrixEntry*squares) +
		unknowns*(r.Product*largest+r.Entry*(squares+coordinates)) +
		r.Pair*unknowns*unknowns + factor*unknowns*unknowns*unknowns
	return Toll{
		Seconds: r.Start + r.Coefficient*(squares+coordinates+unknowns) + r.Iterations*work/r.Flops,
		Bytes:   r.Bytes + bytesPerReal*(r.Copies*unknowns*unknowns+r.Matrices*(squares+coordinates)),
	}
}

// realCoordinates counts the real numbers in one item of a size. The heads of complex lorentz cones are real.
func realCoordinates(k Kind, n float64) float64 {
	switch k.Field {
	case model.Complex:
		switch k.Cone {
		case model.Lorentz:
			return 2*n - 1
		case model.RotatedLorentz:
			return 2*n - 2
		}
		return 2 * n
	case model.Symmetric:
		return n * (n + 1) / 2
	case model.Hermitian:
		return n * n
	}
	return n
}
