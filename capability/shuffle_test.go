package capability_test

import (
	"fmt"
	"math/rand/v2"
	"testing"

	. "towpath/capability"
)

// printed joins all proposals: what a reader sees is what must not change.
func printed(proposals []Proposal) string {
	text := ""
	for i := range proposals {
		text += proposals[i].String()
		if r := proposals[i].Route; r != nil {
			text += fmt.Sprintf("%v %v %v %v\n", r.Load, r.Toll, r.Exactness, r.Legs)
		}
	}
	return text
}

// TestOrderDoesNotMatter plans again and again with rules, sheets and demands in another order. Tolls are drawn so that
// ties are frequent, among them one that is constant.
func TestOrderDoesNotMatter(t *testing.T) {
	routes := 0
	for seed := range uint64(400) {
		r := rand.New(rand.NewPCG(seed, 2))
		rules := randomRules(r, someKinds, 4+r.IntN(8))
		for _, x := range rules {
			x.exactness = Exactness(r.IntN(3))
		}
		var sheets []*Sheet
		for i := range 3 {
			s := &Sheet{Name: fmt.Sprintf("s%d", i), Takes: map[Kind]int{someKinds[r.IntN(5)]: 0, someKinds[r.IntN(5)]: 0}, Returns: LiftsAll, Mounts: seed%3 == 0, Toll: randomToll(r, someKinds, seed%3 == 0)}
			if seed%4 == 0 {
				s.Toll, s.Mounts = func(Load) Toll { return Toll{Seconds: 1} }, false
			}
			sheets = append(sheets, s)
		}
		var demands []Demand
		for range 4 {
			demands = append(demands, Demand{Kind: someKinds[r.IntN(5)], Size: 1 + r.IntN(3), Count: 1 + r.IntN(3)})
		}
		o := Options{Allow: []Exactness{Inner, Outer}}
		want := ""
		for k := range 5 {
			proposals := Plan(demands, shuffled(r, rules), sheets, o)
			for _, p := range proposals {
				if p.Route != nil {
					routes++
				}
			}
			if got := printed(proposals); k == 0 {
				want = got
			} else if got != want {
				t.Fatalf("seed %d: another order gives another plan:\n%s\n%s", seed, want, got)
			}
			r.Shuffle(len(demands), func(i, j int) { demands[i], demands[j] = demands[j], demands[i] })
			r.Shuffle(len(sheets), func(i, j int) { sheets[i], sheets[j] = sheets[j], sheets[i] })
			r.Shuffle(len(o.Allow), func(i, j int) { o.Allow[i], o.Allow[j] = o.Allow[j], o.Allow[i] })
		}
	}
	if routes < 1000 {
		t.Fatalf("only %d routes were compared", routes)
	}
}
