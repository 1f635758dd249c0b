package model

// Outcome is what a back end says of a model.
type Outcome uint8

const (
	OutcomeUnknown Outcome = iota
	Optimal                // a solution within the accuracy asked for
	Infeasible             // with a certificate: Answer.Farkas
	Unbounded              // with a certificate: Answer.Ray
	Inaccurate             // the best point found, short of the accuracy asked for
	Stopped                // a limit was reached or the job was withdrawn
)

// String returns the outcome's word.
func (o Outcome) String() string {
	switch o {
	case Optimal:
		return "optimal"
	case Infeasible:
		return "infeasible"
	case Unbounded:
		return "unbounded"
	case Inaccurate:
		return "inaccurate"
	case Stopped:
		return "stopped"
	}
	return "unknown"
}

// Point gives a number to every entry: Values[b] lists the entries of block b.
type Point struct{ Values [][]complex128 }

// Multipliers gives a number to every row and every bounded entry. Constraints[k] lists the rows of
// constraint k; Bounds[b] the entries of block b, nil for a block without bounds.
type Multipliers struct {
	Constraints [][]complex128
	Bounds      [][]complex128
}

// Answer is what came back for a model, in the model's own terms. Absent parts are nil. Objective and Bound are
// in the model's own sense (Bound limits the optimum from below for a minimization, from above for a
// maximization); NaN where unknown.
type Answer struct {
	Outcome     Outcome
	Objective   float64
	Bound       float64
	Point       *Point
	Multipliers *Multipliers
	Farkas      *Multipliers // certificate of infeasibility
	Ray         *Point       // certificate of unboundedness
	Iterations  int
	Note        string // the back end's own words, for people
}
