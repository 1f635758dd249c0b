package dense

import "sync"

// Mul sets c = a b. c must not be a or b.
func Mul(n int, c, a, b []complex128) {
	if fastest == nil || n < leastOrder {
		mulGo(n, c, a, b)
		return
	}
	fastest.multiply(n, c, a, b, false)
}

// MulH sets c = a b^H. c must not be a or b.
func MulH(n int, c, a, b []complex128) {
	if fastest == nil || n < leastOrder {
		mulHGo(n, c, a, b)
		return
	}
	fastest.multiply(n, c, a, b, true)
}

// steps is how many columns of a, and rows of b, are packed at a time: panels of b that stay in the second-level cache.
const steps = 192

// pack is memory for packed panels.
type pack struct{ a, b, tile []float64 }

var packs = sync.Pool{New: func() any { return new(pack) }}

// multiply sets c = a b, or a b^H when adjoint, in the manner of K. Goto and R. van de Geijn, Anatomy of high-performance
// matrix multiplication, 2008 (from memory): panels packed in the order in which the kernel reads them.
func (k *kernel) multiply(n int, c, a, b []complex128, adjoint bool) {
	p := packs.Get().(*pack)
	defer packs.Put(p)
	panels := (n + k.columns - 1) / k.columns
	depth := min(n, steps)
	grow(&p.a, 2*k.rows*depth)
	grow(&p.b, 2*k.columns*depth*panels)
	grow(&p.tile, 2*k.rows*k.columns)
	for k0 := 0; k0 < n; k0 += steps {
		k1 := min(k0+steps, n)
		for j := range panels {
			to := p.b[2*k.columns*(k1-k0)*j:]
			if adjoint {
				packAdjoint(to, b, n, j*k.columns, k.columns, k0, k1)
			} else {
				packColumns(to, b, n, j*k.columns, k.columns, k0, k1)
			}
		}
		for i := 0; i < n; i += k.rows {
			packRows(p.a, a, n, i, k.rows, k0, k1)
			for j := range panels {
				k.tile(k1-k0, &p.a[0], &p.b[2*k.columns*(k1-k0)*j], &p.tile[0])
				k.unpack(c, p.tile, n, i, j*k.columns, k0 > 0)
			}
		}
	}
}

// grow gives room for n numbers.
func grow(v *[]float64, n int) {
	if cap(*v) < n {
		*v = make([]float64, n)
	}
	*v = (*v)[:n]
}

// packRows packs rows i to i+rows of a; rows beyond the matrix are zero.
func packRows(to []float64, a []complex128, n, i, rows, k0, k1 int) {
	for r := range rows {
		if i+r >= n {
			for at, k := r, k0; k < k1; k, at = k+1, at+2*rows {
				to[at], to[at+rows] = 0, 0
			}
			continue
		}
		at := r
		for _, z := range a[(i+r)*n+k0 : (i+r)*n+k1] {
			to[at], to[at+rows] = real(z), imag(z)
			at += 2 * rows
		}
	}
}

// packColumns packs columns j to j+columns of b.
func packColumns(to []float64, b []complex128, n, j, columns, k0, k1 int) {
	here := min(columns, n-j)
	for k := k0; k < k1; k++ {
		re, im := to[:columns], to[columns:2*columns]
		for c, z := range b[k*n+j : k*n+j+here] {
			re[c], im[c] = real(z), imag(z)
		}
		clear(re[here:])
		clear(im[here:])
		to = to[2*columns:]
	}
}

// packAdjoint packs columns j to j+columns of b^H.
func packAdjoint(to []float64, b []complex128, n, j, columns, k0, k1 int) {
	here := min(columns, n-j)
	for c := range columns {
		at := c
		if c >= here {
			for range k1 - k0 {
				to[at], to[at+columns] = 0, 0
				at += 2 * columns
			}
			continue
		}
		for _, z := range b[(j+c)*n+k0 : (j+c)*n+k1] {
			to[at], to[at+columns] = real(z), -imag(z)
			at += 2 * columns
		}
	}
}

// unpack writes, or adds, a tile to c.
func (k *kernel) unpack(c []complex128, tile []float64, n, i, j int, add bool) {
	here := min(k.columns, n-j)
	for r := range min(k.rows, n-i) {
		re, im := tile[2*k.columns*r:2*k.columns*r+here], tile[2*k.columns*r+k.columns:2*k.columns*r+k.columns+here]
		row := c[(i+r)*n+j : (i+r)*n+j+here]
		if add {
			for x := range row {
				row[x] += complex(re[x], im[x])
			}
			continue
		}
		for x := range row {
			row[x] = complex(re[x], im[x])
		}
	}
}
