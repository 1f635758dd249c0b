package interior

import (
	"cmp"
	"math"
	"slices"
)

// sparseSystem is a reduced system of which most numbers are zero: its lower triangle by rows, and the factor L D L' by columns
// in an order of few fill-ins.
type sparseSystem struct {
	n     int
	start []int   // of each row of the lower triangle
	col   []int32 // rising in each row; the last is the diagonal
	v     []float64

	place  []int32 // of every unknown in the order
	target []int32 // of every entry in lx; -1-p for the diagonal at place p
	lstart []int
	lrow   []int32 // by places, rising in each column
	lx, d  []float64

	work       []float64
	head, next []int32 // columns that wait for their next row
	at         []int
}

// sparseShare is up to which share of a full factor the sparse one is taken: its loops run slower than dense ones.
const sparseShare = 0.15

// newSparseSystem analyses the pattern of the reduced system; nil when it is not sparse.
func newSparseSystem(f *form) *sparseSystem {
	n := f.rows + f.free
	if n < 64 || n > 30000 {
		return nil
	}
	graph := make([]bitset, n)
	for i := range graph {
		graph[i] = newBitset(n)
		graph[i].add(i)
	}
	clique := func(keys []int) bool {
		if 2*len(keys) > n {
			return false
		}
		all := newBitset(n)
		for _, k := range keys {
			all.add(k)
		}
		for _, k := range keys {
			graph[k].join(all)
		}
		return true
	}
	for r := range f.bu {
		for _, c := range f.bu[r].at {
			graph[r].add(f.rows + c)
			graph[f.rows+c].add(r)
		}
	}
	for _, it := range f.items {
		if _, ok := it.cone.(*orthant); !ok {
			if !clique(it.keys) {
				return nil
			}
			continue
		}
		for _, keys := range it.byCoordinate() {
			if !clique(keys) {
				return nil
			}
		}
	}
	s := &sparseSystem{n: n, start: []int{0}}
	for i, g := range graph {
		for _, j := range g.list() {
			if int(j) <= i {
				s.col = append(s.col, j)
			}
		}
		s.start = append(s.start, len(s.col))
	}
	order, columns, ok := eliminate(graph, int(sparseShare*float64(n)*float64(n)/2))
	if !ok {
		return nil
	}
	s.v = make([]float64, len(s.col))
	s.plan(order, columns)
	return s
}

// byCoordinate lists the keys that meet each coordinate.
func (it *item) byCoordinate() [][]int {
	out := make([][]int, it.dim())
	for i, k := range it.keys {
		for _, a := range it.data[i].at {
			out[a] = append(out[a], k)
		}
	}
	return out
}

// plan lays the factor out and finds where every entry goes.
func (s *sparseSystem) plan(order []int32, columns [][]int32) {
	n := s.n
	s.place = make([]int32, n)
	for p, i := range order {
		s.place[i] = int32(p)
	}
	s.lstart = make([]int, n+1)
	for p, c := range columns {
		for k, i := range c {
			c[k] = s.place[i]
		}
		slices.Sort(c)
		s.lrow = append(s.lrow, c...)
		s.lstart[p+1] = len(s.lrow)
	}
	s.target = make([]int32, len(s.col))
	for i := range n {
		for e := s.start[i]; e < s.start[i+1]; e++ {
			p, q := s.place[i], s.place[s.col[e]]
			if p == q {
				s.target[e] = -1 - p
				continue
			}
			row, column := max(p, q), min(p, q)
			k, _ := slices.BinarySearch(s.lrow[s.lstart[column]:s.lstart[column+1]], row)
			s.target[e] = int32(s.lstart[column] + k)
		}
	}
	s.lx, s.d = make([]float64, len(s.lrow)), make([]float64, n)
	s.work, s.at = make([]float64, n), make([]int, n)
	s.head, s.next = make([]int32, n), make([]int32, n)
}

func (s *sparseSystem) clear() { clear(s.v) }

func (s *sparseSystem) largest(into []float64) {
	for i := range s.n {
		for e := s.start[i]; e < s.start[i+1]; e++ {
			v, j := math.Abs(s.v[e]), s.col[e]
			into[i], into[j] = max(into[i], v), max(into[j], v)
		}
	}
}

func (s *sparseSystem) scale(by []float64) {
	for i := range s.n {
		for e := s.start[i]; e < s.start[i+1]; e++ {
			s.v[e] *= by[i] * by[s.col[e]]
		}
	}
}

// add adds to entry (i, j), i >= j, which is in the pattern.
func (s *sparseSystem) add(i, j int, v float64) {
	row := s.col[s.start[i]:s.start[i+1]]
	k, _ := slices.BinarySearchFunc(row, j, func(a int32, b int) int { return cmp.Compare(int(a), b) })
	s.v[s.start[i]+k] += v
}

// factor is L D L' by columns from the left; shift regularises, and pivots without their sign are repaired (see kkt).
func (s *sparseSystem) factor(r regularity, rows int) bool {
	n := s.n
	clear(s.lx)
	for e, t := range s.target {
		if t >= 0 {
			s.lx[t] = s.v[e]
		} else {
			s.d[-1-t] = s.v[e]
		}
	}
	for i := range n {
		if p := s.place[i]; i < rows {
			s.d[p] += r.shift
		} else {
			s.d[p] -= r.shift
		}
	}
	positive := make([]bool, n)
	for i := range rows {
		positive[s.place[i]] = true
	}
	for j := range s.head {
		s.head[j] = -1
	}
	for j := range n {
		a, b := s.lstart[j], s.lstart[j+1]
		for p := a; p < b; p++ {
			s.work[s.lrow[p]] = s.lx[p]
		}
		d := s.d[j]
		for k := s.head[j]; k >= 0; {
			after := s.next[k]
			p, end := s.at[k], s.lstart[k+1]
			f := s.lx[p] * s.d[k]
			d -= s.lx[p] * f
			for q := p + 1; q < end; q++ {
				s.work[s.lrow[q]] -= s.lx[q] * f
			}
			s.wait(k, p+1)
			k = after
		}
		if math.IsNaN(d) {
			return false
		}
		sign := -1.0
		if positive[j] {
			sign = 1
		}
		if !(d*sign > r.floor) {
			d = sign * r.repair
		}
		s.d[j] = d
		for p := a; p < b; p++ {
			s.lx[p] = s.work[s.lrow[p]] / d
		}
		s.wait(int32(j), a)
	}
	return true
}

// wait puts column k on the list of the row at p, where it is needed next.
func (s *sparseSystem) wait(k int32, p int) {
	s.at[k] = p
	if p < s.lstart[k+1] {
		row := s.lrow[p]
		s.next[k], s.head[row] = s.head[row], k
	}
}

func (s *sparseSystem) backsolve(x []float64) {
	y := s.work
	for i, p := range s.place {
		y[p] = x[i]
	}
	for j := range s.n {
		t := y[j]
		for p := s.lstart[j]; p < s.lstart[j+1]; p++ {
			y[s.lrow[p]] -= s.lx[p] * t
		}
	}
	for j := range y {
		y[j] /= s.d[j]
	}
	for j := s.n - 1; j >= 0; j-- {
		t := y[j]
		for p := s.lstart[j]; p < s.lstart[j+1]; p++ {
			t -= s.lx[p] * y[s.lrow[p]]
		}
		y[j] = t
	}
	for i, p := range s.place {
		x[i] = y[p]
	}
}

// multiply sets dst = K x.
func (s *sparseSystem) multiply(dst, x []float64) {
	clear(dst)
	for i := range s.n {
		t, sum := x[i], 0.0
		for e := s.start[i]; e < s.start[i+1]; e++ {
			j := int(s.col[e])
			sum += s.v[e] * x[j]
			if j < i {
				dst[j] += s.v[e] * t
			}
		}
		dst[i] += sum
	}
}
