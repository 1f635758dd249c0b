// Command generate writes the assembly kernels of package dense. It is a module of its own, so that the generator is no
// dependency of the product.
package main

import (
	"fmt"

	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	"github.com/mmcloughlin/avo/reg"
)

// tile describes a kernel that multiplies packed panels: rows of a, each number broadcast, by vectors of b.
type tile struct {
	name    string
	doc     string
	rows    int
	vectors int // of b, each of width numbers
	width   int
	vector  func() reg.VecVirtual
}

func main() {
	write(tile{"tileAVX2", "AVX2 and FMA", 4, 1, 4, YMM})
	write(tile{"tileAVX512", "AVX-512F", 4, 2, 8, ZMM})
	Generate()
}

// write emits c = sum over k of a[k] b[k]^T, complex. In each step a has the real parts of the rows, then the imaginary
// parts; so has b of the columns; c has for each row the real parts, then the imaginary parts.
func write(t tile) {
	TEXT(t.name, NOSPLIT, "func(k int, a, b, c *float64)")
	Pragma("noescape")
	Doc(fmt.Sprintf("%s multiplies packed panels of %d rows and %d columns with %s; see tileGo.", t.name, t.rows, t.vectors*t.width, t.doc))
	k, a, b, c := Load(Param("k"), GP64()), Load(Param("a"), GP64()), Load(Param("b"), GP64()), Load(Param("c"), GP64())
	var re, im [][]reg.VecVirtual
	for range t.rows {
		var r, i []reg.VecVirtual
		for range t.vectors {
			x, y := t.vector(), t.vector()
			zero(x)
			zero(y)
			r, i = append(r, x), append(i, y)
		}
		re, im = append(re, r), append(im, i)
	}
	vectorBytes := 8 * t.width
	half := t.vectors * vectorBytes
	Label("loop")
	TESTQ(k, k)
	JZ(LabelRef("done"))
	var bre, bim []reg.VecVirtual
	for v := range t.vectors {
		x, y := t.vector(), t.vector()
		VMOVUPD(Mem{Base: b, Disp: v * vectorBytes}, x)
		VMOVUPD(Mem{Base: b, Disp: half + v*vectorBytes}, y)
		bre, bim = append(bre, x), append(bim, y)
	}
	for i := range t.rows {
		x := t.vector()
		VBROADCASTSD(Mem{Base: a, Disp: 8 * i}, x)
		for v := range t.vectors {
			VFMADD231PD(bre[v], x, re[i][v])
			VFMADD231PD(bim[v], x, im[i][v])
		}
		y := t.vector()
		VBROADCASTSD(Mem{Base: a, Disp: 8 * (t.rows + i)}, y)
		for v := range t.vectors {
			VFNMADD231PD(bim[v], y, re[i][v])
			VFMADD231PD(bre[v], y, im[i][v])
		}
	}
	ADDQ(U32(16*t.rows), a)
	ADDQ(U32(2*half), b)
	DECQ(k)
	JMP(LabelRef("loop"))
	Label("done")
	for i := range t.rows {
		for v := range t.vectors {
			VMOVUPD(re[i][v], Mem{Base: c, Disp: 2*half*i + v*vectorBytes})
			VMOVUPD(im[i][v], Mem{Base: c, Disp: 2*half*i + half + v*vectorBytes})
		}
	}
	VZEROUPPER()
	RET()
}

// zero clears a vector.
func zero(v reg.VecVirtual) {
	if v.Size() == 64 {
		VPXORQ(v, v, v)
		return
	}
	VXORPD(v, v, v)
}
