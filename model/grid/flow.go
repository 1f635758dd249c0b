package grid

import "math/cmplx"

// flow is the power that enters a branch at one end, linear in the voltage products W_ij = V_i conj(V_j):
//
//	S = own * W_own,own + mutual * W_own,other
type flow struct{ own, mutual complex128 }

// flows returns the powers entering at the from and at the to end.
//
// With series admittance y = 1/(r + jx), charging b and complex ratio T (voltage behind the ideal transformer:
// V_f/T), Ohm's law gives the current into the series side at the from end
//
//	I = y (V_f/T - V_t) + (jb/2) V_f/T,   S_ft = (V_f/T) conj(I)
//
// and likewise at the to end. Multiplied out (common practice of the trade, no source):
//
//	S_ft = (conj(y) - jb/2)/|T|^2 W_ff - conj(y)/T W_ft
//	S_tf = (conj(y) - jb/2)       W_tt - conj(y)/conj(T) W_tf
func (l *Branch) flows() (from, to flow) {
	y := 1 / complex(l.ResistancePU, l.ReactancePU)
	yc := cmplx.Conj(y)
	t := l.ratio()
	own := yc - complex(0, l.ChargingPU/2)
	size := real(t)*real(t) + imag(t)*imag(t)
	return flow{own / complex(size, 0), -yc / t}, flow{own, -yc / cmplx.Conj(t)}
}

// ratio returns the complex transformer ratio.
func (l *Branch) ratio() complex128 {
	tap := l.Tap
	if tap == 0 {
		tap = 1
	}
	return cmplx.Rect(tap, radians(l.ShiftDeg))
}
