package interior

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// denseSystem is a reduced system as a full matrix: n^2 numbers twice.
type denseSystem struct {
	n int
	k []float64 // lower triangle by rows
	l []float64
	d []float64
}

const panel = 48 // columns factored at a time

func newDenseSystem(n int) *denseSystem {
	return &denseSystem{n: n, k: make([]float64, n*n), l: make([]float64, n*n), d: make([]float64, n)}
}

func (s *denseSystem) clear() { clear(s.k) }

func (s *denseSystem) add(i, j int, v float64) { s.k[i*s.n+j] += v }

func (s *denseSystem) largest(into []float64) {
	for i := range s.n {
		for j, v := range s.k[i*s.n : i*s.n+i+1] {
			v = math.Abs(v)
			into[i], into[j] = max(into[i], v), max(into[j], v)
		}
	}
}

func (s *denseSystem) scale(by []float64) {
	for i := range s.n {
		for j := range s.k[i*s.n : i*s.n+i+1] {
			s.k[i*s.n+j] *= by[i] * by[j]
		}
	}
}

// factor is a panelled L D L'.
func (s *denseSystem) factor(r regularity, rows int) bool {
	n, l := s.n, s.l
	for i := range n {
		copy(l[i*n:i*n+i+1], s.k[i*n:i*n+i+1])
		delta := r.shift
		if i >= rows {
			delta = -delta
		}
		l[i*n+i] += delta
	}
	w := make([]float64, n*panel)
	for j0 := 0; j0 < n; j0 += panel {
		j1 := min(j0+panel, n)
		if !s.factorPanel(j0, j1, r, rows) {
			return false
		}
		m, kb := n-j1, j1-j0
		if m == 0 {
			break
		}
		for i := range m {
			for k := range kb {
				w[i*kb+k] = l[(j1+i)*n+j0+k] * s.d[j0+k]
			}
		}
		const strip = 128
		for i0 := 0; i0 < m; i0 += strip {
			i1 := min(i0+strip, m)
			blas64.Gemm(blas.NoTrans, blas.Trans, -1,
				blas64.General{Rows: i1 - i0, Cols: kb, Stride: kb, Data: w[i0*kb : i1*kb]},
				blas64.General{Rows: i1, Cols: kb, Stride: n, Data: l[j1*n+j0:]}, 1,
				blas64.General{Rows: i1 - i0, Cols: i1, Stride: n, Data: l[(j1+i0)*n+j1:]})
		}
	}
	return true
}

func (s *denseSystem) factorPanel(j0, j1 int, r regularity, rows int) bool {
	n, l := s.n, s.l
	v := make([]float64, j1-j0)
	for j := j0; j < j1; j++ {
		lj := l[j*n+j0 : j*n+j]
		for k, x := range lj {
			v[k] = x * s.d[j0+k]
		}
		d := l[j*n+j] - dot(lj, v)
		sign := 1.0
		if j >= rows {
			sign = -1
		}
		if math.IsNaN(d) {
			return false
		}
		if !(d*sign > r.floor) {
			d = sign * r.repair
		}
		s.d[j] = d
		for i := j + 1; i < n; i++ {
			l[i*n+j] = (l[i*n+j] - dot(v[:j-j0], l[i*n+j0:i*n+j])) / d
		}
	}
	return true
}

func (s *denseSystem) backsolve(x []float64) {
	n, l := s.n, s.l
	for i := range x {
		x[i] -= dot(l[i*n:i*n+i], x[:i])
	}
	for i := range x {
		x[i] /= s.d[i]
	}
	for i := n - 1; i >= 0; i-- {
		t := x[i]
		for k, v := range l[i*n : i*n+i] {
			x[k] -= v * t
		}
	}
}

// multiply sets dst = K x.
func (s *denseSystem) multiply(dst, x []float64) {
	n := s.n
	clear(dst)
	for i := range n {
		row := s.k[i*n : i*n+i]
		dst[i] += dot(row, x[:i]) + s.k[i*n+i]*x[i]
		t := x[i]
		for k, v := range row {
			dst[k] += v * t
		}
	}
}
