package interior

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// kkt is the reduced system
//
//	[ A H A'   B          ]
//	[ B'      -F' H^-1 F  ]  over (y, u),
//
// made quasi-definite by a small regularisation and factored as L D L' without pivoting (Vanderbei 1995, from memory);
// solutions are refined against the system as it was. Dense: n^2 numbers twice.
type kkt struct {
	f *form
	n int
	k []float64 // lower triangle by rows, equilibrated
	l []float64
	d []float64
	e []float64 // equilibration: the system is E K E

	patterns map[*item]*pattern // of psd items, once they are known
	regularity
}

const (
	equilibrations = 4
	refinements    = 3
	panel          = 48 // columns factored at a time
)

// regularity is how firmly the equilibrated system is regularised. A pivot below floor has lost its sign and is replaced by
// repair (dependent rows, columns nobody uses).
type regularity struct{ shift, floor, repair float64 }

// firmness lists what is tried in turn. The first bounds steps along directions in which next to nothing curves, which
// unbounded and infeasible models have; the last costs no accuracy but needs a sound system.
var firmness = []regularity{{1e-8, 1e-9, 1e-5}, {1e-10, 1e-11, 1e-6}, {1e-13, 1e-13, 1e-7}}

func newKKT(f *form) *kkt {
	n := f.rows + f.free
	return &kkt{f: f, n: n, k: make([]float64, n*n), l: make([]float64, n*n), d: make([]float64, n), e: make([]float64, n), patterns: map[*item]*pattern{}, regularity: firmness[0]}
}

// build forms the matrix at the present scalings and factors it; ok is false when it holds NaN.
func (s *kkt) build() (ok bool) {
	n := s.n
	clear(s.k)
	for r := range s.f.bu {
		row := &s.f.bu[r]
		for i, c := range row.at {
			s.k[(s.f.rows+c)*n+r] += row.v[i]
		}
	}
	for _, it := range s.f.items {
		s.gram(it)
	}
	s.equilibrate()
	for i := range n {
		copy(s.l[i*n:i*n+i+1], s.k[i*n:i*n+i+1])
		delta := s.shift
		if i >= s.f.rows {
			delta = -delta
		}
		s.l[i*n+i] += delta
	}
	return s.factor()
}

// equilibrate scales rows and columns to largest numbers near one (D. Ruiz 2001, from memory): near the end the scalings of
// the cones span twenty orders of magnitude, and what is small of one row is not small of another.
func (s *kkt) equilibrate() {
	n := s.n
	for i := range s.e {
		s.e[i] = 1
	}
	largest := make([]float64, n)
	for range equilibrations {
		clear(largest)
		for i := range n {
			for j, v := range s.k[i*n : i*n+i+1] {
				v = math.Abs(v)
				largest[i], largest[j] = max(largest[i], v), max(largest[j], v)
			}
		}
		for i, v := range largest {
			largest[i] = 1
			if v > 0 && !math.IsInf(v, 0) {
				largest[i] = math.Exp2(-math.Round(math.Log2(v) / 2)) // powers of two round nothing
			}
			s.e[i] *= largest[i]
		}
		for i := range n {
			for j := range s.k[i*n : i*n+i+1] {
				s.k[i*n+j] *= largest[i] * largest[j]
			}
		}
	}
}

// gram adds D' H D of a block, or subtracts D' H^-1 D of a map.
func (s *kkt) gram(it *item) {
	sign := 1.0
	if !it.isBlock {
		sign = -1
	}
	if o, ok := it.cone.(*orthant); ok {
		s.gramOrthant(it, o, sign)
		return
	}
	if c, ok := it.cone.(*psd); ok {
		s.gramPSD(it, c, sign)
		return
	}
	h, x := make([]float64, it.dim()), make([]float64, it.dim())
	for i, k := range it.keys {
		clear(x)
		it.data[i].addTo(x, 1)
		it.apply(h, x, !it.isBlock)
		for j, l := range it.keys[:i+1] {
			s.k[k*s.n+l] += sign * it.data[j].dot(h)
		}
	}
}

// gramOrthant adds coordinate by coordinate: the scaling is diagonal.
func (s *kkt) gramOrthant(it *item, o *orthant, sign float64) {
	type coefficient struct {
		key int
		v   float64
	}
	lists := make([][]coefficient, o.n)
	for i, k := range it.keys {
		d := &it.data[i]
		for j, a := range d.at {
			lists[a] = append(lists[a], coefficient{k, d.v[j]})
		}
	}
	for a, list := range lists {
		h := o.h[a]
		if !it.isBlock {
			h = 1 / h
		}
		for i, x := range list {
			for _, y := range list[:i+1] {
				s.k[x.key*s.n+y.key] += sign * h * x.v * y.v
			}
		}
	}
}

// factor is a panelled L D L'.
func (s *kkt) factor() bool {
	n, l := s.n, s.l
	w := make([]float64, n*panel)
	for j0 := 0; j0 < n; j0 += panel {
		j1 := min(j0+panel, n)
		if !s.factorPanel(j0, j1) {
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

func (s *kkt) factorPanel(j0, j1 int) bool {
	n, l := s.n, s.l
	v := make([]float64, j1-j0)
	for j := j0; j < j1; j++ {
		lj := l[j*n+j0 : j*n+j]
		for k, x := range lj {
			v[k] = x * s.d[j0+k]
		}
		d := l[j*n+j] - dot(lj, v)
		sign := 1.0
		if j >= s.f.rows {
			sign = -1
		}
		if math.IsNaN(d) {
			return false
		}
		if !(d*sign > s.floor) {
			d = sign * s.repair
		}
		s.d[j] = d
		for i := j + 1; i < n; i++ {
			l[i*n+j] = (l[i*n+j] - dot(v[:j-j0], l[i*n+j0:i*n+j])) / d
		}
	}
	return true
}

func (s *kkt) backsolve(x []float64) {
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
func (s *kkt) multiply(dst, x []float64) {
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

// solve returns x with K x = g as far as refinement gets.
func (s *kkt) solve(g []float64) []float64 {
	g = append([]float64(nil), g...)
	for i := range g {
		g[i] *= s.e[i]
	}
	x := append([]float64(nil), g...)
	s.backsolve(x)
	r := make([]float64, s.n)
	last := math.Inf(1)
	for range refinements {
		s.multiply(r, x)
		for i := range r {
			r[i] = g[i] - r[i]
		}
		e := norm(r)
		if e <= 1e-16*(1+norm(g)) || !(e <= 0.5*last) {
			break
		}
		last = e
		s.backsolve(r)
		for i := range x {
			x[i] += r[i]
		}
	}
	for i := range x {
		x[i] *= s.e[i]
	}
	return x
}
