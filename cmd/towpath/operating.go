package main

import (
	"fmt"
	"io"
	"math"
	"math/cmplx"
	"text/tabwriter"

	"towpath/broker/wire"
	"towpath/model"
	"towpath/model/archipelago"
	"towpath/model/grid"
	towpathv1 "towpath/proto/towpath/v1"
)

// writeOperatingPoint reads voltages out of the voltage matrix, where it has rank one, and prices out of the complex
// multipliers of the power balances.
//
// The balance reads generation - demand - ... = 0, so its multiplier is the growth of cost per unit of demand: the real
// part for active, the imaginary part for reactive power.
func writeOperatingPoint(w io.Writer, cases []archipelago.Case, journeys [][]journey) error {
	n, err := archipelago.Grid()
	if err != nil {
		return err
	}
	var answer *towpathv1.Answer
	for i, c := range cases {
		if c.ID == "grid-matrix" {
			answer = journeys[i][0].answer
		}
	}
	var packed []complex128
	for _, b := range answer.GetValues() {
		if b.GetName() == grid.VoltageProduct {
			if packed, err = wire.NumbersFromProto(b.GetEntries()); err != nil {
				return err
			}
		}
	}
	if len(packed) != model.PackedLen(len(n.Buses)) {
		return nil // no point: the table above says why
	}
	v, rest := leading(packed, len(n.Buses))
	fmt.Fprintf(w, "All but %.1e of the voltage matrix is the product V V^H of these voltages", rest)
	if rest < agreement {
		fmt.Fprint(w, ": the bound is attained.\n\n")
	} else {
		fmt.Fprint(w, ": no operating point is read from it.\n\n")
	}
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "bus\t\tvoltage\tangle\tprice of active\tand reactive power")
	for i, b := range n.Buses {
		price := complex(math.NaN(), math.NaN())
		for _, c := range answer.GetMultipliers().GetConstraints() {
			if c.GetName() == fmt.Sprintf("power balance at bus %d", b.ID) {
				if y, err := wire.NumbersFromProto(c.GetValues()); err == nil && len(y) == 1 {
					price = y[0] / complex(n.BaseMVA, 0)
				}
			}
		}
		fmt.Fprintf(t, "%d\t%s\t%.4f pu\t%+.2f deg\t%.2f per MWh\t%.2f per MVArh\n", b.ID, b.Name,
			cmplx.Abs(v[i]), cmplx.Phase(v[i]/v[0])*180/math.Pi, real(price), imag(price))
	}
	return t.Flush()
}

// leading returns the vector v for which v v^H is the largest part of a positive semidefinite matrix, by the power
// method, and the Frobenius norm of what is left, relative to the whole.
func leading(packed []complex128, n int) (v []complex128, rest float64) {
	const rounds = 200 // each shrinks the error by the ratio of the second eigenvalue to the first
	at := func(i, j int) complex128 {
		if i >= j {
			return packed[model.PackedIndex(n, i, j)]
		}
		return cmplx.Conj(packed[model.PackedIndex(n, j, i)])
	}
	v = make([]complex128, n)
	for i := range v {
		v[i] = 1
	}
	value := 0.0
	for range rounds {
		next := make([]complex128, n)
		size := 0.0
		for i := range next {
			for j := range v {
				next[i] += at(i, j) * v[j]
			}
			size = math.Hypot(size, cmplx.Abs(next[i]))
		}
		if size == 0 {
			return v, math.NaN()
		}
		for i := range next {
			next[i] /= complex(size, 0)
		}
		v, value = next, size
	}
	whole := 0.0
	for i := range v {
		for j := range v {
			whole = math.Hypot(whole, cmplx.Abs(at(i, j)))
			rest = math.Hypot(rest, cmplx.Abs(at(i, j)-complex(value, 0)*v[i]*cmplx.Conj(v[j])))
		}
	}
	for i := range v {
		v[i] *= complex(math.Sqrt(value), 0)
	}
	return v, rest / whole
}
