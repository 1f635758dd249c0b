package interior

import "towpath/capability"

// rates were set by hand so that predictions for eleven programs of SDPLIB, from 4 ms to 15 s, come within a factor of 3.5 of
// what one core of a 2-core server measured in December 2026 where the time is above 0.1 s (theta2 2.7 s predicted, 2.3
// measured; mcp100 1.7, 1.1; arch0 7.5, 14.8; theta1 0.2, 0.4), but for control2 (0.02, 0.22), whose iterations are hard.
// Coefficients there are sparse; where they are dense, Product is too small. The engine works on complex matrices, for symmetric ones too.
var rates = capability.Rates{
	Start: 5e-4, Iterations: 18, Flops: 4e9,
	Matrix: 80, ComplexCore: true, Scalar: 100, Product: 0.1, Entry: 4, Pair: 30,
	Bytes: 1e5, Copies: 2, Matrices: 12,
}

func toll(l capability.Load) capability.Toll { return capability.InteriorToll(l, rates) }
