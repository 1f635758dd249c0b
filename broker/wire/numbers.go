// Package wire converts between the wire contract towpath.v1 and the in-memory model, both ways, and cuts large messages
// into chunks and puts them together again.
//
// Faults in what a client sends are *model.FaultError, like those of the model itself.
package wire

import (
	"encoding/binary"
	"fmt"
	"math"
	"unsafe"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

// littleEndian tells whether this host stores numbers as the wire does, so that bytes can be read where they lie.
func littleEndian() bool {
	x := uint16(1)
	return *(*byte)(unsafe.Pointer(&x)) == 1
}

// fault makes the typed error that names a place and a cure.
func fault(path, place, problem, cure string) error {
	return &model.FaultError{Faults: []model.Fault{{Path: path, Place: place, Problem: problem, Cure: cure}}}
}

// number is what arrays consist of.
type number interface {
	~int | ~uint32 | ~float64 | ~complex128
}

// numbersIn reads little-endian bytes, a multiple of T's size: in place when host and alignment allow, else by decode.
func numbersIn[T number](data []byte, inPlace bool, decode func([]byte) T) []T {
	var zero T
	size := int(unsafe.Sizeof(zero))
	n := len(data) / size
	if n == 0 {
		return []T{}
	}
	start := unsafe.Pointer(unsafe.SliceData(data))
	if inPlace && uintptr(start)%unsafe.Alignof(zero) == 0 {
		return unsafe.Slice((*T)(start), n)
	}
	out := make([]T, n)
	for i := range out {
		out[i] = decode(data[i*size:])
	}
	return out
}

// bytesIn writes numbers as little-endian bytes, sharing memory where the host allows.
func bytesIn[T number](x []T, inPlace bool, encode func([]byte, T) []byte) []byte {
	if len(x) == 0 {
		return []byte{}
	}
	if inPlace {
		return unsafe.Slice((*byte)(unsafe.Pointer(unsafe.SliceData(x))), len(x)*int(unsafe.Sizeof(x[0])))
	}
	var out []byte
	for _, v := range x {
		out = encode(out, v)
	}
	return out
}

func decodeStart(b []byte) int          { return int(binary.LittleEndian.Uint64(b)) }
func decodeColumn(b []byte) uint32      { return binary.LittleEndian.Uint32(b) }
func decodeReal(b []byte) float64       { return math.Float64frombits(binary.LittleEndian.Uint64(b)) }
func decodeComplex(b []byte) complex128 { return complex(decodeReal(b), decodeReal(b[8:])) }

func encodeStart(b []byte, v int) []byte     { return binary.LittleEndian.AppendUint64(b, uint64(v)) }
func encodeColumn(b []byte, v uint32) []byte { return binary.LittleEndian.AppendUint32(b, v) }
func encodeReal(b []byte, v float64) []byte {
	return binary.LittleEndian.AppendUint64(b, math.Float64bits(v))
}
func encodeComplex(b []byte, v complex128) []byte { return encodeReal(encodeReal(b, real(v)), imag(v)) }

func arrayOf(data []byte) *towpathv1.Array {
	return &towpathv1.Array{Place: &towpathv1.Array_Data{Data: data}}
}

// arrayBytes returns an array's bytes, which must be a multiple of size.
func arrayBytes(a *towpathv1.Array, path, place string, size int) ([]byte, error) {
	if a.GetUpload() != nil {
		return nil, fault(path, place, "an array is announced as an upload, but this message has no chunks", "send the model with UploadModel, or put the bytes into data")
	}
	data := a.GetData()
	if len(data)%size != 0 {
		return nil, fault(path, place, fmt.Sprintf("an array has %d bytes, which is no multiple of %d", len(data), size), fmt.Sprintf("send %d bytes per number, little-endian", size))
	}
	return data, nil
}

// numbersFromProto decodes a list of numbers in any of its three forms.
func numbersFromProto(n *towpathv1.Numbers, path, place string) ([]complex128, error) {
	forms := 0
	for _, given := range []bool{len(n.GetRe()) > 0 || len(n.GetIm()) > 0, n.GetF64() != nil, n.GetC128() != nil} {
		if given {
			forms++
		}
	}
	if forms > 1 {
		return nil, fault(path, place, "numbers are given in more than one form", "use re (and im), or f64, or c128")
	}
	switch {
	case n.GetF64() != nil:
		data, err := arrayBytes(n.GetF64(), path+".f64", place, 8)
		if err != nil {
			return nil, err
		}
		out := make([]complex128, len(data)/8)
		for i := range out {
			out[i] = complex(decodeReal(data[8*i:]), 0)
		}
		return out, nil
	case n.GetC128() != nil:
		data, err := arrayBytes(n.GetC128(), path+".c128", place, 16)
		if err != nil {
			return nil, err
		}
		return numbersIn(data, littleEndian(), decodeComplex), nil
	}
	re, im := n.GetRe(), n.GetIm()
	if len(im) != 0 && len(im) != len(re) {
		return nil, fault(path, place, fmt.Sprintf("there are %d real and %d imaginary parts", len(re), len(im)), "give as many of both, or no imaginary parts")
	}
	out := make([]complex128, len(re))
	for i, v := range re {
		out[i] = complex(v, 0)
		if len(im) > 0 {
			out[i] = complex(v, im[i])
		}
	}
	return out, nil
}

// readable is how many numbers or terms are still written one by one, for people.
const readable = 256

// numbersToProto encodes a list: one by one when short, as bytes when long.
func numbersToProto(x []complex128, isComplex bool) *towpathv1.Numbers {
	n := &towpathv1.Numbers{}
	switch {
	case len(x) <= readable:
		for _, v := range x {
			n.Re = append(n.Re, real(v))
			if isComplex {
				n.Im = append(n.Im, imag(v))
			}
		}
	case isComplex:
		n.C128 = arrayOf(bytesIn(x, littleEndian(), encodeComplex))
	default:
		re := make([]float64, len(x))
		for i, v := range x {
			re[i] = real(v)
		}
		n.F64 = arrayOf(bytesIn(re, littleEndian(), encodeReal))
	}
	return n
}
