package main

import (
	"encoding/binary"
	"fmt"
	"math"

	towpathv1 "towpath/proto/towpath/v1"
)

// numbersOf reads a list of numbers in any of its three forms.
func numbersOf(n *towpathv1.Numbers) ([]complex128, error) {
	if n == nil {
		return nil, nil
	}
	if a := n.GetC128(); a != nil {
		return arrayOf(a, 2)
	}
	if a := n.GetF64(); a != nil {
		return arrayOf(a, 1)
	}
	z := make([]complex128, len(n.GetRe()))
	for k, re := range n.GetRe() {
		z[k] = complex(re, 0)
	}
	if len(n.GetIm()) > 0 && len(n.GetIm()) != len(z) {
		return nil, fmt.Errorf("%d imaginary parts for %d real parts", len(n.GetIm()), len(z))
	}
	for k, im := range n.GetIm() {
		z[k] += complex(0, im)
	}
	return z, nil
}

// arrayOf reads little-endian numbers of one or two 8-byte parts.
func arrayOf(a *towpathv1.Array, parts int) ([]complex128, error) {
	data := a.GetData()
	if a.GetUpload() != nil {
		return nil, fmt.Errorf("an array was announced but did not arrive")
	}
	if len(data)%(8*parts) != 0 {
		return nil, fmt.Errorf("an array of %d bytes does not hold whole numbers", len(data))
	}
	z := make([]complex128, len(data)/(8*parts))
	for k := range z {
		at := data[k*8*parts:]
		im := 0.0
		if parts == 2 {
			im = math.Float64frombits(binary.LittleEndian.Uint64(at[8:]))
		}
		z[k] = complex(math.Float64frombits(binary.LittleEndian.Uint64(at)), im)
	}
	return z, nil
}
