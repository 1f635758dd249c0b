package capability

// Exactness types a bridge or a whole route: whether the optimum is kept.
type Exactness uint8

const (
	Exact Exactness = iota // same optimum
	Inner                  // may lose feasible points
	Outer                  // may add points
)

// Lifts says what can be carried back (by a bridge) or is returned (by a back end).
type Lifts uint8

const (
	LiftsValues        Lifts = 1 << iota // primal values
	LiftsMultipliers                     // multipliers of every constraint
	LiftsInfeasibility                   // certificates of infeasibility
	LiftsUnboundedness                   // certificates of unboundedness

	LiftsAll = LiftsValues | LiftsMultipliers | LiftsInfeasibility | LiftsUnboundedness
)

// Rule is the sizes-only view of a bridge: all that the planner sees of it.
type Rule interface {
	// ID is the bridge's name, like "hermitian-psd/real-2n". It never changes.
	ID() string
	// From is the kind that the bridge rewrites.
	From() Kind
	// Yields says what ONE demand of the given size becomes: kinds, sizes and counts, exactly what lowering
	// produces (Nonzeros is ignored). ok is false when the bridge does not apply at that size.
	Yields(size int) (parts []Demand, ok bool)
	Exactness() Exactness
	Lifts() Lifts
	// LastResort marks a bridge that is valid but takes the interior away from a model or its uniqueness, which no toll
	// of sizes sees. It is crossed only where the sheet does not take From natively.
	LastResort() bool
}

// Load is what a route asks of a sheet in the end: the total of every native kind and size, sorted by kind and
// size, each pair once.
type Load []Demand

// Toll is the predicted cost of a route: seconds on one core and peak bytes of the solve. One unit of toll is
// one second; bytes decide only whether a route fits.
type Toll struct{ Seconds, Bytes float64 }

// Sheet is what a back end declares of itself.
type Sheet struct {
	Name    string // like "interior/complex": back end, slash, variant
	Backend string
	Version string
	// Takes lists the native kinds; the number is the largest size taken, 0 for no limit.
	Takes map[Kind]int
	// Needs lists kinds of which a load must have at least one (some matrix solvers refuse a model without rows).
	Needs    []Kind
	Returns  Lifts
	Accuracy float64 // relative gap and feasibility that the back end usually reaches
	// Toll predicts the cost of a load; it must not fall when a size or a count grows.
	// The load is sorted by kind and size, and is the caller's again when Toll returns.
	Toll func(Load) Toll
	// Mounts says that loads cost at least as many seconds together as apart: Toll(a and b) + Toll(nothing) >= Toll(a) +
	// Toll(b). So it is where counts and sizes enter as powers from the first on, as products, and as maxima that
	// multiply a total; not where one thing hides behind another. It lets the planner prove much more with much less effort.
	Mounts bool
}
