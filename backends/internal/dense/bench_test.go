package dense

import (
	"fmt"
	"math/rand/v2"
	"testing"
)

// BenchmarkMul reports flops per second, a complex multiplication and addition counted as 8.
func BenchmarkMul(b *testing.B) {
	ways := map[string]func(n int, c, x, y []complex128){"Go": mulGo}
	for _, k := range kernels() {
		ways[k.name] = func(n int, c, x, y []complex128) { k.multiply(n, c, x, y, false) }
	}
	for _, n := range []int{8, 12, 16, 32, 64, 128, 256} {
		for name, mul := range ways {
			b.Run(fmt.Sprint(n, "/", name), func(b *testing.B) {
				r := rand.New(rand.NewPCG(5, 6))
				x, y, c := random(r, n), random(r, n), make([]complex128, n*n)
				for b.Loop() {
					mul(n, c, x, y)
				}
				b.ReportMetric(8*float64(n*n*n)*float64(b.N)/b.Elapsed().Seconds()/1e9, "Gflop/s")
			})
		}
	}
}
