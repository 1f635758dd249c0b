package model

// ConeKind names the set that a block or the rows of a map must lie in.
type ConeKind uint8

const (
	Free           ConeKind = iota // no restriction; blocks only
	Zero                           // all rows zero; maps only
	Nonneg                         // every row (entry) >= 0; real
	Range                          // lower <= row <= upper, real and imaginary part separately; maps only
	Lorentz                        // row 0 >= 2-norm of the rest; row 0 real, the rest real or complex
	RotatedLorentz                 // 2 u v >= ||w||^2, u, v >= 0; rows 0 and 1 real, the rest real or complex
	PSD                            // positive semidefinite; symmetric or Hermitian
	Box                            // bounds of a block: never a block's or a constraint's cone, only a kind's
)

// String returns the word used in kinds, logs and messages.
func (k ConeKind) String() string {
	switch k {
	case Free:
		return "free"
	case Zero:
		return "zero"
	case Nonneg:
		return "nonneg"
	case Range:
		return "range"
	case Lorentz:
		return "lorentz"
	case RotatedLorentz:
		return "rotated-lorentz"
	case PSD:
		return "psd"
	case Box:
		return "box"
	}
	return "unknown-cone"
}

// Cone is the set of one constraint.
type Cone struct {
	Kind ConeKind
	// Lower and Upper belong to Range only: one number per row, infinite where a side is absent. For complex
	// rows real parts limit the real part and imaginary parts the imaginary part.
	Lower, Upper []complex128
}

// heads returns how many leading rows of a complex vector in the cone are real.
func (k ConeKind) heads() int {
	switch k {
	case Lorentz:
		return 1
	case RotatedLorentz:
		return 2
	}
	return 0
}
