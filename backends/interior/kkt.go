package interior

import "math"

// kkt is the reduced system
//
//	[ A H A'   B          ]
//	[ B'      -F' H^-1 F  ]  over (y, u),
//
// made quasi-definite by a small regularisation and factored as L D L' without pivoting (R. Vanderbei 1995, from memory);
// solutions are refined against the system as it was.
type kkt struct {
	f *form
	n int
	system
	e []float64 // equilibration: the system is E K E

	patterns map[*item]*pattern // of psd items, once they are known
	regularity
}

// system is a symmetric matrix K of which the lower triangle is kept, and its factor L D L'.
type system interface {
	clear()
	add(i, j int, v float64)            // i >= j
	largest(into []float64)             // the largest size of a number in every row of K
	scale(by []float64)                 // K becomes B K B, B = diag(by)
	factor(r regularity, rows int) bool // pivots of the first rows are positive, the others negative; false for NaN
	backsolve(x []float64)
	multiply(dst, x []float64) // dst = K x
}

const (
	equilibrations = 4
	refinements    = 3
)

// regularity is how firmly the equilibrated system is regularised. A pivot below floor has lost its sign and is replaced by
// repair (dependent rows, columns nobody uses).
type regularity struct{ shift, floor, repair float64 }

// firmness lists what is tried in turn. The first bounds steps along directions in which next to nothing curves, which
// unbounded and infeasible models have; the last costs no accuracy but needs a sound system.
var firmness = []regularity{{1e-8, 1e-9, 1e-5}, {1e-10, 1e-11, 1e-6}, {1e-13, 1e-13, 1e-7}}

func newKKT(f *form) *kkt {
	n := f.rows + f.free
	s := &kkt{f: f, n: n, e: make([]float64, n), patterns: map[*item]*pattern{}, regularity: firmness[0]}
	if sparse := newSparseSystem(f); sparse != nil {
		s.system = sparse
	} else {
		s.system = newDenseSystem(n)
	}
	return s
}

// form fills the matrix at the present scalings.
func (s *kkt) form() {
	s.clear()
	for r := range s.f.bu {
		row := &s.f.bu[r]
		for i, c := range row.at {
			s.add(s.f.rows+c, r, row.v[i])
		}
	}
	for _, it := range s.f.items {
		s.gram(it)
	}
	s.equilibrate()
}

// equilibrate scales rows and columns to largest numbers near one (D. Ruiz 2001, from memory): near the end the scalings of
// the cones span twenty orders of magnitude, and what is small of one row is not small of another.
func (s *kkt) equilibrate() {
	for i := range s.e {
		s.e[i] = 1
	}
	by := make([]float64, s.n)
	for range equilibrations {
		clear(by)
		s.largest(by)
		for i, v := range by {
			by[i] = 1
			if v > 0 && !math.IsInf(v, 0) {
				by[i] = math.Exp2(-math.Round(math.Log2(v) / 2)) // powers of two round nothing
			}
			s.e[i] *= by[i]
		}
		s.scale(by)
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
			s.add(k, l, sign*it.data[j].dot(h))
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
				s.add(x.key, y.key, sign*h*x.v*y.v)
			}
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
