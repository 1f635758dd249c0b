package interior

import (
	"math"
	"math/rand/v2"
	"testing"
)

// chain is a form with a block of nonneg columns and rows that each meet a few neighbours, and free columns in some of them:
// a reduced system that is sparse.
func chain(rng *rand.Rand, rows, free int) *form {
	f := &form{rows: rows, free: free, b: make([]float64, rows), cu: make([]float64, free), bu: make([]sparse, rows)}
	x := &item{cone: &orthant{n: 2 * rows}, isBlock: true, given: map[int]*sparse{}, offset: make([]float64, 2*rows)}
	for r := range rows {
		for _, at := range []int{r, r + 1, r + rows} {
			x.put(r, at%(2*rows), rng.NormFloat64())
		}
		if c := r * free / rows; rng.IntN(2) == 0 {
			f.bu[r].put(c, 1+rng.Float64())
		}
	}
	x.finish(rows)
	f.items = []*item{x}
	for c := range free {
		z := &item{cone: newLorentz(3), given: map[int]*sparse{}, offset: make([]float64, 3)}
		z.put(-1-c, 0, 1+rng.Float64())
		z.put(-1-(c+1)%free, 1+rng.IntN(2), 1+rng.Float64())
		z.finish(rows)
		f.items = append(f.items, z)
	}
	return f
}

// The sparse system is the dense one in less room: same products, and factors that solve it.
func TestSparseSystemIsTheDenseOne(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 7))
	for _, size := range [][2]int{{60, 20}, {150, 40}, {300, 100}} {
		f := chain(rng, size[0], size[1])
		sparse := newSparseSystem(f)
		if sparse == nil {
			t.Fatalf("%v is not taken as sparse", size)
		}
		for _, it := range f.items {
			if !it.scale(inside(it.cone, rng), inside(it.cone, rng)) {
				t.Fatal("inner points are refused")
			}
		}
		n := f.rows + f.free
		a := &kkt{f: f, n: n, system: sparse, e: make([]float64, n), patterns: map[*item]*pattern{}}
		b := &kkt{f: f, n: n, system: newDenseSystem(n), e: make([]float64, n), patterns: map[*item]*pattern{}}
		a.form()
		b.form()
		x, ax, bx := make([]float64, n), make([]float64, n), make([]float64, n)
		for k := range x {
			x[k] = rng.NormFloat64()
		}
		a.multiply(ax, x)
		b.multiply(bx, x)
		if e := apart(ax, bx); e > 1e-13 {
			t.Errorf("%v: products differ by %g", size, e)
		}
		if e := apart(a.e, b.e); e != 0 {
			t.Errorf("%v: scalings differ by %g", size, e)
		}
		for _, r := range firmness {
			for _, k := range []*kkt{a, b} {
				if !k.factor(r, f.rows) {
					t.Fatalf("%v: no factor", size)
				}
				// The factor solves K + shift, of which the product is known.
				y := append([]float64(nil), ax...)
				for i := range y {
					if i < f.rows {
						y[i] += r.shift * x[i]
					} else {
						y[i] -= r.shift * x[i]
					}
				}
				k.backsolve(y)
				k.multiply(bx, y)
				off, large := 0.0, 1.0
				for i := range bx {
					s := r.shift
					if i >= f.rows {
						s = -s
					}
					off, large = max(off, math.Abs(bx[i]+s*y[i]-ax[i]-s*x[i])), max(large, math.Abs(y[i]))
				}
				if off > 1e-11*large {
					t.Errorf("%v, shift %g: the factor is off by %g", size, r.shift, off)
				}
			}
		}
	}
}

// Minimum degree on a star takes the leaves first and makes no fill; on a path neither.
func TestEliminationOrder(t *testing.T) {
	const n = 70
	star, path := make([]bitset, n), make([]bitset, n)
	for i := range n {
		star[i], path[i] = newBitset(n), newBitset(n)
	}
	join := func(g []bitset, i, j int) { g[i].add(j); g[j].add(i) }
	for i := 1; i < n; i++ {
		join(star, 0, i)
		join(path, i-1, i)
	}
	for name, g := range map[string][]bitset{"star": star, "path": path} {
		order, columns, ok := eliminate(g, n*n)
		total := 0
		for _, c := range columns {
			total += len(c)
		}
		if !ok || len(order) != n || total != n-1 {
			t.Errorf("%s: %d in order, %d below the diagonal, want %d and %d", name, len(order), total, n, n-1)
		}
	}
	full := make([]bitset, 5)
	for i := range full {
		full[i] = newBitset(5)
		for j := range 5 {
			full[i].add(j)
		}
	}
	if _, _, ok := eliminate(full, 9); ok {
		t.Error("a limit of 9 is kept for a factor of 10")
	}
}
