package dense

import (
	"fmt"
	"math/rand/v2"
	"testing"
)

// BenchmarkMul reports flops per second, a complex multiplication and addition counted as 8.
func BenchmarkMul(b *testing.B) {
	for _, n := range []int{8, 32, 64, 128} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			r := rand.New(rand.NewPCG(5, 6))
			x, y, c := random(r, n), random(r, n), make([]complex128, n*n)
			for b.Loop() {
				Mul(n, c, x, y)
			}
			b.ReportMetric(8*float64(n*n*n)*float64(b.N)/b.Elapsed().Seconds()/1e9, "Gflop/s")
		})
	}
}
