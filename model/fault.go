package model

import (
	"fmt"
	"strings"
)

// Fault is one thing wrong with a client's model: where, what, and what to do about it.
type Fault struct {
	Path    string // for programs, like constraints[3].map.lin
	Place   string // for people, like constraint 3 'power balance', row 12
	Problem string
	Cure    string
}

// String is the sentence for people.
func (f Fault) String() string { return f.Place + ": " + f.Problem + "; " + f.Cure }

// FaultError is what Validate returns: the first faults, and how many more there are.
type FaultError struct {
	Faults []Fault
	More   int
}

// Error lists the faults, one per line.
func (e *FaultError) Error() string {
	lines := make([]string, len(e.Faults), len(e.Faults)+1)
	for i, f := range e.Faults {
		lines[i] = f.String()
	}
	if e.More > 0 {
		lines = append(lines, fmt.Sprintf("and %d more faults", e.More))
	}
	return strings.Join(lines, "\n")
}

// shownFaults is how many faults an error spells out: enough to fix a model, few enough to read and to send.
const shownFaults = 20
