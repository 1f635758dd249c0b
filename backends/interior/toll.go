package interior

import "towpath/capability"

// rates are estimates, fitted to nothing yet: products of matrices alone run at 5.7e9 flops per second (BenchmarkMul, median at
// orders 32 to 128, one core of a 2-core server, December 2026), everything around them slower. The engine works on
// complex matrices, for symmetric ones too.
var rates = capability.Rates{
	Start: 1e-4, Iterations: 15, Flops: 1.5e9,
	Matrix: 80, ComplexCore: true, Scalar: 100, Product: 4, Entry: 4, Pair: 30,
	Bytes: 1e5, Copies: 2, Matrices: 12,
}

func toll(l capability.Load) capability.Toll { return capability.InteriorToll(l, rates) }
