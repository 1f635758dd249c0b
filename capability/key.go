package capability

import (
	"cmp"
	"math"
)

// key is what a choice is judged by, in the order of its fields; less is better.
type key struct {
	missing   int     // kinds that the sheet needs and the load has not
	over      float64 // bytes above the memory limit
	seconds   float64
	inexact   int // demands that go over bridges which are not exact
	crossings int // bridges
}

// compare is negative where a is better.
func (a key) compare(b key) int {
	return cmp.Or(cmp.Compare(a.missing, b.missing), cmp.Compare(a.over, b.over), cmp.Compare(a.seconds, b.seconds),
		cmp.Compare(a.inexact, b.inexact), cmp.Compare(a.crossings, b.crossings))
}

// dropped is how many of the 52 binary digits of a toll do not count. Sums taken in another order differ in the last few;
// with 32 digits left, routes tie that agree to nine decimal ones, and predictions have two good ones at most.
const dropped = 20

// coarse rounds a toll to the digits that count. It keeps order, so bounds stay bounds. What is no number counts as
// infinite, what is negative as nothing.
func coarse(x float64) float64 {
	switch {
	case math.IsNaN(x):
		return math.Inf(1)
	case x <= 0:
		return 0
	}
	rounded := math.Float64frombits((math.Float64bits(x) + 1<<(dropped-1)) &^ (1<<dropped - 1))
	if math.IsNaN(rounded) { // of infinity
		return math.Inf(1)
	}
	return rounded
}
