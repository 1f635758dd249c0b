package interior

import (
	"towpath/backends/internal/dense"
	"towpath/capability"
)

// rates were set by hand against what one core of a 2-core server with AVX-512 measured in December 2026: programs of SDPLIB and
// grids, 1 ms to 5 s. Where the time is above 0.1 s, predictions come within a factor of 2.5, but for hard iterations, which
// the engine repeats at other regularities (control2: 0.02 s predicted, 0.1 measured). Without assembly kernels products take
// ten times as long, and they are about half of the work. Coefficients are taken to be sparse; where they are dense, Product
// is too small. Factor lies between a dense factorisation and the sparse ones of grids. The engine works on complex matrices, for symmetric ones too.
var rates = capability.Rates{
	Start: 1e-3, Iterations: 20, Flops: flops(),
	Matrix: 60, ComplexCore: true, Scalar: 20000, Product: 0.1, Entry: 4, Pair: 20, Factor: 0.1,
	Bytes: 1e5, Copies: 2, Matrices: 12,
}

func flops() float64 {
	if dense.Accelerated() {
		return 12e9
	}
	return 3e9
}

func toll(l capability.Load) capability.Toll { return capability.InteriorToll(l, rates) }
