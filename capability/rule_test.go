package capability_test

import (
	"fmt"

	. "towpath/capability"
	"towpath/model"
)

// testRule is a rule written down as data.
type testRule struct {
	id         string
	from       Kind
	parts      []testPart
	least      int // smallest size at which the rule applies, 0 for any
	largest    int // largest, 0 for any
	exactness  Exactness
	lifts      Lifts
	lastResort bool
}

// testPart is a number of items of a size, both written in n, the size that the rule is asked for. What falls below one
// is not yielded.
type testPart struct {
	kind        Kind
	size, count formula
}

// formula is (square n^2 + times n + plus) / over.
type formula struct{ square, times, plus, over int }

func (f formula) at(n int) int { return (f.square*n*n + f.times*n + f.plus) / f.over }

func (f formula) String() string {
	return fmt.Sprintf("(%dnn%+dn%+d)/%d", f.square, f.times, f.plus, f.over)
}

func number(k int) formula { return formula{plus: k, over: 1} }

func (r *testRule) ID() string           { return r.id }
func (r *testRule) From() Kind           { return r.from }
func (r *testRule) Exactness() Exactness { return r.exactness }
func (r *testRule) Lifts() Lifts         { return r.lifts }
func (r *testRule) LastResort() bool     { return r.lastResort }

func (r *testRule) Yields(n int) ([]Demand, bool) {
	if n < r.least || r.largest > 0 && n > r.largest {
		return nil, false
	}
	var out []Demand
	for _, p := range r.parts {
		d := Demand{Kind: p.kind, Size: p.size.at(n), Count: p.count.at(n)}
		if d.Size >= 1 && d.Count >= 1 {
			out = append(out, d)
		}
	}
	return out, true
}

func (r *testRule) String() string {
	text := fmt.Sprintf("%s: %s ->", r.id, r.from)
	for _, p := range r.parts {
		text += fmt.Sprintf(" %s of size %s, %s times;", p.kind, p.size, p.count)
	}
	return text + fmt.Sprintf(" for n in %d..%d, %s, last resort %v", r.least, r.largest, r.exactness, r.lastResort)
}

// someKinds are kinds that have sizes.
var someKinds = []Kind{
	{OnBlock, model.Symmetric, model.PSD},
	{OnMap, model.Real, model.Lorentz},
	{OnMap, model.Hermitian, model.PSD},
	{OnBlock, model.Real, model.RotatedLorentz},
	{OnMap, model.Symmetric, model.Zero},
}
