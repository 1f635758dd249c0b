package interior

import (
	"towpath/capability"
	"towpath/model"
)

// Constants of the toll. They are estimates, fitted to nothing yet: matrix products alone run at 5.7e9 flops per second
// (BenchmarkMul, median at orders 32 to 128, one core of a 2-core server, December 2026), everything around them slower.
const (
	iterations = 15
	rate       = 1.5e9 // flops per second
	overhead   = 1e-4  // seconds for anything at all
)

// toll counts flops per iteration: congruences and eigenvalues of matrices, the products that fill the reduced system
// (one congruence per unknown that meets a matrix; sizes alone do not tell which do, so the count is that of a matrix per
// unknown, shared out), and its factorisation. Bytes are those of the reduced system and of the matrices.
func toll(l capability.Load) capability.Toll {
	var unknowns, cones, largest, memory float64
	for _, d := range l {
		n, count := float64(d.Size), float64(d.Count)
		dim := n // real coordinates
		if d.Kind.Field.IsMatrix() {
			dim = n * (n + 1) / 2
			if d.Kind.Field == model.Hermitian {
				dim = n * n
			}
		} else if d.Kind.Field == model.Complex {
			dim = 2 * n
		}
		switch d.Kind.Cone {
		case model.PSD: // the engine works on complex matrices, for symmetric ones too
			cones += count * 8 * 40 * n * n * n
			largest = max(largest, 8*2*n*n*n)
			memory += count * 16 * 11 * n * n
		case model.Zero, model.Free:
			unknowns += count * dim
		default:
			cones += count * (400 + 100*dim)
			memory += count * 160 * dim
		}
	}
	work := cones + unknowns*(largest+2000) + unknowns*unknowns*30 + unknowns*unknowns*unknowns/3
	return capability.Toll{Seconds: overhead + iterations*work/rate, Bytes: 16*unknowns*unknowns + memory + 1e5}
}
