package wire

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"hash"
	"math"

	"towpath/model"
)

// ModelID names a model by its content: the SHA-256, in hexadecimal, of its blocks, objective and constraints in a fixed
// order, numbers as little-endian bytes. Terms and compressed rows of the same model have the same name.
func ModelID(m *model.Model) string {
	w := &hasher{h: sha256.New()}
	w.text(m.Name)
	w.count(len(m.Blocks))
	for k := range m.Blocks {
		b := &m.Blocks[k]
		w.text(b.Name)
		w.count(int(b.Field), b.Rows, b.Cols, int(b.Cone))
		if b.Bounds == nil {
			w.count(0)
			continue
		}
		w.count(1)
		w.numbers(b.Bounds.Lower)
		w.numbers(b.Bounds.Upper)
	}
	o := &m.Objective
	w.count(int(o.Sense), len(o.Col))
	for _, c := range o.Col {
		w.count(int(c))
	}
	w.numbers(o.Coef)
	w.numbers([]complex128{complex(o.Const, 0)})
	w.count(len(m.Constraints))
	for k := range m.Constraints {
		c := &m.Constraints[k]
		w.text(c.Name)
		w.count(int(c.Map.Field), int(c.Cone.Kind), c.Map.Rows())
		w.numbers(c.Cone.Lower)
		w.numbers(c.Cone.Upper)
		w.numbers(c.Map.Const)
		w.matrix(&c.Map.Lin)
		if c.Map.Conj != nil && c.Map.Conj.Nonzeros() > 0 {
			w.count(1)
			w.matrix(c.Map.Conj)
		} else {
			w.count(0)
		}
	}
	return hex.EncodeToString(w.h.Sum(nil))
}

// hasher feeds a hash in blocks.
type hasher struct {
	h   hash.Hash
	buf []byte
}

func (w *hasher) flush() {
	w.h.Write(w.buf)
	w.buf = w.buf[:0]
}

func (w *hasher) put(x uint64) {
	w.buf = binary.LittleEndian.AppendUint64(w.buf, x)
	if len(w.buf) >= 4096 {
		w.flush()
	}
}

func (w *hasher) text(s string) {
	w.put(uint64(len(s)))
	w.flush()
	w.h.Write([]byte(s))
}

func (w *hasher) count(n ...int) {
	for _, x := range n {
		w.put(uint64(x))
	}
	w.flush()
}

func (w *hasher) numbers(x []complex128) {
	w.put(uint64(len(x)))
	for _, v := range x {
		w.put(math.Float64bits(real(v)))
		w.put(math.Float64bits(imag(v)))
	}
	w.flush()
}

func (w *hasher) matrix(m *model.Matrix) {
	w.put(uint64(len(m.Col)))
	for _, s := range m.Start {
		w.put(uint64(s))
	}
	for p, c := range m.Col {
		v := m.At(p)
		w.put(uint64(c))
		w.put(math.Float64bits(real(v)))
		w.put(math.Float64bits(imag(v)))
	}
	w.flush()
}
