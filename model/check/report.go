package check

import (
	"fmt"
	"math"
	"strings"
)

// Verdict is what an examination found. Larger is worse.
type Verdict uint8

const (
	Unexamined Verdict = iota
	Proved             // a rigorous bound holds; no examination says so yet
	Checked            // all residuals are within tolerance
	Doubtful           // residuals are too large to trust, or parts are missing
	Refuted            // a claim is contradicted
)

// String returns the verdict's word.
func (v Verdict) String() string {
	switch v {
	case Proved:
		return "proved"
	case Checked:
		return "checked"
	case Doubtful:
		return "doubtful"
	case Refuted:
		return "refuted"
	}
	return "unexamined"
}

// Tolerances of an examination.
type Tolerances struct {
	Residual float64 // allowed in every relative residual; 0 means DefaultResidual
}

const (
	// DefaultResidual is what interior-point solvers reach in double precision with digits to spare.
	DefaultResidual = 1e-6
	// contradiction times the tolerance separates an answer that fell short (doubtful) from one that contradicts its
	// claim of optimality (refuted).
	contradiction = 1e3
	// secondary times the tolerance is allowed in what adds up several residuals: claimed values, prices.
	secondary = 10
	// A point (or multipliers) larger than growth times the model's own numbers, whose violation times its size, both in
	// units of those numbers, exceeds growthProduct, gets its feasibility from its size: so do points of weakly infeasible
	// models and multipliers across a duality gap.
	growth        = 1e5
	growthProduct = 1e-2
	// certificateProduct bounds residual times size of a certificate of value 1 (see the package comment).
	certificateProduct = 1e-4
	// uncancelled bounds the residuals of a certificate relative to the terms they are left of. A residual that is not small
	// against its terms is small only because the model is written in small numbers: 1e-9 x >= 1 has solutions.
	uncancelled = 1e-3
	// certificateSize bounds the size of a certificate of value 1: beyond it rounding of the data alone could undo it.
	certificateSize = 1e10
)

// ConstraintResiduals belong to one constraint; distances are absolute, NaN means not known.
type ConstraintResiduals struct {
	Number             int
	Name               string
	Distance           float64 // of the rows from the cone
	SmallestEigenvalue float64 // psd only
	MultiplierDistance float64 // of the multiplier from the dual cone
	Complementarity    float64 // |<y, F(x)>|
}

// BlockResiduals belong to one block; distances are absolute, NaN means not known.
type BlockResiduals struct {
	Number             int
	Name               string
	Distance           float64 // of the block from its cone
	SmallestEigenvalue float64 // psd only
	BoundViolation     float64
	Stationarity       float64 // distance of the reduced cost from the dual of the block's cone
}

// Report is the outcome of an examination; NaN means not known. The package comment defines the residuals.
type Report struct {
	Verdict            Verdict
	Reasons            []string // why the verdict is not better, and what else is worth knowing
	Objective          float64  // recomputed
	Bound              float64  // recomputed dual objective, in the model's sense
	RelativeGap        float64
	Primal             float64 // largest
	Dual               float64 // largest
	Complementarity    float64 // largest
	Price              float64
	CertificateResidue float64 // of a certificate scaled to value 1
	CertificateSize    float64
	Constraints        []ConstraintResiduals
	Blocks             []BlockResiduals
}

func blank() Report {
	nan := math.NaN()
	return Report{Verdict: Checked, Objective: nan, Bound: nan, RelativeGap: nan, Primal: nan, Dual: nan, Complementarity: nan, Price: nan,
		CertificateResidue: nan, CertificateSize: nan}
}

// CertificateRadius is the norm below which a certificate of infeasibility rules out every point; NaN without one.
func (r *Report) CertificateRadius() float64 { return 1 / r.CertificateResidue }

func (r *Report) because(v Verdict, format string, a ...any) {
	r.Reasons = append(r.Reasons, fmt.Sprintf(format, a...))
	r.Verdict = max(r.Verdict, v)
}

// judge compares a relative residual with what is allowed. claimed says whether missing it by far contradicts a claim.
func (r *Report) judge(value, allowed float64, claimed bool, format string, a ...any) {
	if value <= allowed {
		return
	}
	v := Doubtful
	if claimed && !(value <= allowed*contradiction) {
		v = Refuted
	}
	r.because(v, "%s is %.2g, allowed %.2g", fmt.Sprintf(format, a...), value, allowed)
}

// String lists the report for people: the verdict with the largest residuals, then the reasons.
func (r Report) String() string {
	var b strings.Builder
	b.WriteString(r.Verdict.String())
	part := func(word string, v float64) {
		if !math.IsNaN(v) {
			fmt.Fprintf(&b, "  %s %.1e", word, v)
		}
	}
	part("primal", r.Primal)
	part("dual", r.Dual)
	part("complementarity", r.Complementarity)
	part("gap", r.RelativeGap)
	part("certificate", r.CertificateResidue)
	b.WriteByte('\n')
	for _, s := range r.Reasons {
		fmt.Fprintf(&b, "  %s\n", s)
	}
	return b.String()
}
