package archipelago

import "towpath/model"

// Case is one model with its story.
type Case struct {
	ID    string // short, for tables and file names
	Story string // one sentence
	Model *model.Model
	Known *Known // nil when no closed form is known
}

// Known is what is known of an optimum without solving.
type Known struct {
	Source    string
	Objective float64
	// Multipliers by the constraint's number; only unique ones are listed.
	Multipliers map[int][]complex128
}

// Cases returns all of them in the order of telling. Every call builds them afresh.
func Cases() ([]Case, error) {
	grids, err := gridCases()
	if err != nil {
		return nil, err
	}
	return append(grids, pulses(), sidelobes(), ferries()), nil
}
