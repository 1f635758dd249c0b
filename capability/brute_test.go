package capability_test

import (
	"cmp"
	"encoding/binary"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	. "towpath/capability"
)

// item is a native kind and size; load counts them, and is comparable through text.
type item struct {
	kind Kind
	size int
}

type load map[item]int

func (l load) text() string {
	var b []byte
	for _, d := range l.sorted() {
		b = append(b, byte(d.Kind.Place), byte(d.Kind.Field), byte(d.Kind.Cone))
		b = binary.AppendVarint(binary.AppendVarint(b, int64(d.Size)), int64(d.Count))
	}
	return string(b)
}

func (l load) sorted() Load {
	var out Load
	for i, n := range l {
		out = append(out, Demand{Kind: i.kind, Size: i.size, Count: n})
	}
	slices.SortFunc(out, func(a, b Demand) int {
		return cmp.Or(cmp.Compare(a.Kind.Place, b.Kind.Place), cmp.Compare(a.Kind.Field, b.Kind.Field), cmp.Compare(a.Kind.Cone, b.Kind.Cone), cmp.Compare(a.Size, b.Size))
	})
	return out
}

// exhaustion enumerates loads, with nothing cleverer than leaving out those seen before.
type exhaustion struct {
	rules []*testRule
	sheet *Sheet
	known map[string][]load // by item and depth
	steps int               // left
}

// loads lists the loads of all derivation trees of an item that are at most depth bridges high.
func (x *exhaustion) loads(i item, depth int) []load {
	key := fmt.Sprintf("%v/%d/%d", i.kind, i.size, depth)
	if l, ok := x.known[key]; ok {
		return l
	}
	seen := map[string]load{}
	limit, native := x.sheet.Takes[i.kind]
	if native = native && (limit == 0 || i.size <= limit); native {
		one := load{i: 1}
		seen[one.text()] = one
	}
	for _, r := range x.rules {
		parts, ok := r.Yields(i.size)
		if depth == 0 || r.from != i.kind || !ok || native && r.lastResort {
			continue
		}
		ways := []load{{}}
		for _, p := range parts {
			var longer []load
			for _, w := range ways {
				for _, m := range x.loads(item{p.Kind, p.Size}, depth-1) {
					if x.steps--; x.steps < 0 {
						return nil
					}
					sum := load{}
					for i, n := range w {
						sum[i] += n
					}
					for i, n := range m {
						sum[i] += n * p.Count
					}
					longer = append(longer, sum)
				}
			}
			ways = longer
		}
		for _, w := range ways {
			seen[w.text()] = w
		}
	}
	var out []load
	for _, l := range seen {
		out = append(out, l)
	}
	x.known[key] = out
	return out
}

// cheapest tries every combination of ways for the demands; ok is false when there is none, or too many to try.
func (x *exhaustion) cheapest(demands []Demand, depth int, legal func(load, Toll) bool) (seconds float64, ok bool) {
	totals := []load{{}}
	for _, d := range demands {
		var longer []load
		seen := map[string]bool{}
		for _, t := range totals {
			for _, l := range x.loads(item{d.Kind, d.Size}, depth) {
				if x.steps--; x.steps < 0 {
					return 0, false
				}
				sum := load{}
				for i, n := range t {
					sum[i] += n
				}
				for i, n := range l {
					sum[i] += n * d.Count
				}
				if text := sum.text(); !seen[text] {
					seen[text] = true
					longer = append(longer, sum)
				}
			}
		}
		totals = longer
	}
	seconds = math.Inf(1)
	for _, t := range totals {
		if toll := x.sheet.Toll(t.sorted()); legal(t, toll) {
			seconds, ok = min(seconds, toll.Seconds), true
		}
	}
	return seconds, ok && x.steps >= 0
}

// randomToll draws a toll that rises with sizes and counts and is no sum over items: powers of totals, products and
// maxima of them. If it shall mount, there are no maxima and no caps in it.
func randomToll(r *rand.Rand, kinds []Kind, mounts bool) func(Load) Toll {
	type total struct {
		weight map[Kind]float64
		size   float64 // power of sizes
		power  float64 // of the total
	}
	draw := func() total {
		t := total{weight: map[Kind]float64{}, size: float64(r.IntN(4)), power: float64(1 + r.IntN(3))}
		for _, k := range kinds {
			t.weight[k] = float64(r.IntN(4)) // often the same, often nothing: ties
		}
		return t
	}
	value := func(t total, l Load) float64 {
		sum := 0.0
		for _, d := range l {
			sum += t.weight[d.Kind] * float64(d.Count) * math.Pow(float64(d.Size), t.size)
		}
		return math.Pow(sum, t.power)
	}
	a, b, c, d, e := draw(), draw(), draw(), draw(), draw()
	return func(l Load) Toll {
		if mounts {
			return Toll{Seconds: 1 + value(a, l) + value(b, l)*value(c, l), Bytes: value(b, l) + value(d, l)}
		}
		return Toll{Seconds: value(a, l) + math.Min(1e4, value(b, l)*value(c, l)) + math.Max(value(d, l), value(e, l)), Bytes: value(b, l) + value(d, l)}
	}
}

// randomRules draws rules that are monotone: they apply up to some size, sizes and counts rise with the size asked for.
// Cycles, growth, shrinking and equal rules all occur.
func randomRules(r *rand.Rand, kinds []Kind, n int) []*testRule {
	var out []*testRule
	for i := range n {
		rule := &testRule{id: fmt.Sprintf("b%02d", i), from: kinds[r.IntN(len(kinds))], lifts: LiftsAll, lastResort: r.IntN(6) == 0}
		if r.IntN(3) == 0 {
			rule.largest = 1 + r.IntN(3)
		}
		for range 1 + r.IntN(2) {
			p := testPart{kind: kinds[r.IntN(len(kinds))], size: formula{times: 1, over: 1}, count: number(1 + r.IntN(2))}
			switch r.IntN(6) {
			case 0:
				p.size.times = 2
			case 1:
				p.size.plus = 1
			case 2:
				p.size.plus = -1
			case 3:
				p.size = number(1)
			case 4:
				p.size, p.count = number(1), formula{times: 1, over: 1}
			}
			rule.parts = append(rule.parts, p)
		}
		out = append(out, rule)
	}
	return out
}

// shuffled copies rules as Rules in another order.
func shuffled(r *rand.Rand, rules []*testRule) []Rule {
	var out []Rule
	for _, x := range rules {
		out = append(out, x)
	}
	r.Shuffle(len(out), func(i, j int) { out[i], out[j] = out[j], out[i] })
	return out
}

// checkRoute walks a route and adds up what it ends in, from the rules alone.
func checkRoute(t *testing.T, route *Route, rules []*testRule) {
	t.Helper()
	sum := load{}
	var walk func(l Leg, times int)
	walk = func(l Leg, times int) {
		if l.Bridge == "" {
			limit, ok := route.Sheet.Takes[l.Demand.Kind]
			if !ok || limit > 0 && l.Demand.Size > limit {
				t.Fatalf("%s is called native, %s does not take it", l.Demand, route.Sheet.Name)
			}
			sum[item{l.Demand.Kind, l.Demand.Size}] += times
			return
		}
		k := slices.IndexFunc(rules, func(r *testRule) bool { return r.id == l.Bridge })
		parts, ok := rules[k].Yields(l.Demand.Size)
		if !ok || rules[k].from != l.Demand.Kind || len(parts) != len(l.Parts) {
			t.Fatalf("bridge %s does not lead from %s to %v", l.Bridge, l.Demand, l.Parts)
		}
		for i, p := range parts {
			if l.Parts[i].Demand != p {
				t.Fatalf("bridge %s yields %s, the leg says %s", l.Bridge, p, l.Parts[i].Demand)
			}
			walk(l.Parts[i], times*p.Count)
		}
	}
	for _, l := range route.Legs {
		walk(l, l.Demand.Count)
	}
	if want := sum.sorted(); !slices.Equal(want, route.Load) {
		t.Fatalf("the legs add up to %v, the route says %v", want, route.Load)
	}
	if want := route.Sheet.Toll(route.Load); want != route.Toll {
		t.Fatalf("the load's toll is %v, the route says %v", want, route.Toll)
	}
}

// slack is how far a proven route may be from the best: routes that agree to nine digits tie.
const slack = 1e-9

// TestPlanFindsTheCheapestRoute compares with enumeration on thousands of small graphs.
func TestPlanFindsTheCheapestRoute(t *testing.T) {
	const graphs, depth = 4000, 6
	compared, reached, limited := 0, 0, 0
	for seed := range uint64(graphs) {
		r := rand.New(rand.NewPCG(seed, 1))
		kinds := someKinds[:2+r.IntN(4)]
		rules := randomRules(r, kinds, 2+r.IntN(6))
		sheet := &Sheet{Name: "s", Takes: map[Kind]int{}, Returns: LiftsAll, Mounts: seed%2 == 0, Toll: randomToll(r, kinds, seed%2 == 0)}
		for _, k := range kinds {
			if r.IntN(2) == 0 {
				sheet.Takes[k] = r.IntN(3) * 2
				if slices.ContainsFunc(rules, func(x *testRule) bool { return x.lastResort }) {
					// With a limit, growing beyond it would open a last resort: that is not monotone.
					sheet.Takes[k] = 0
				}
			}
		}
		if r.IntN(4) == 0 {
			// A plan does not let a kind come back larger only to have something that the sheet needs.
			sheet.Needs = []Kind{kinds[r.IntN(len(kinds))]}
			for _, x := range rules {
				for k := range x.parts {
					f := &x.parts[k].size
					f.times, f.plus = min(f.times, 1), min(f.plus, 1-f.times)
				}
			}
		}
		var o Options
		if r.IntN(4) == 0 {
			o.MaxBytes = float64(1 + r.IntN(200))
		}
		var demands []Demand
		for range 1 + r.IntN(3) {
			d := Demand{Kind: kinds[r.IntN(len(kinds))], Size: 1 + r.IntN(3), Count: 1 + r.IntN(3)}
			if !slices.ContainsFunc(demands, func(x Demand) bool { return x.Kind == d.Kind && x.Size == d.Size }) {
				demands = append(demands, d)
			}
		}
		x := &exhaustion{rules: rules, sheet: sheet, known: map[string][]load{}, steps: 5_000}
		want, ok := x.cheapest(demands, depth, func(l load, toll Toll) bool {
			for _, k := range sheet.Needs {
				has := false
				for i := range l {
					has = has || i.kind == k
				}
				if !has {
					return false
				}
			}
			return o.MaxBytes == 0 || toll.Bytes <= o.MaxBytes
		})
		got := Plan(demands, shuffled(r, rules), []*Sheet{sheet}, o)[0]
		describe := func() string {
			text := fmt.Sprintf("seed %d: %v\ntakes %v, needs %v, at most %v bytes\n", seed, demands, sheet.Takes, sheet.Needs, o.MaxBytes)
			for _, r := range rules {
				text += r.String() + "\n"
			}
			return text + got.String()
		}
		if got.Route != nil {
			checkRoute(t, got.Route, rules)
			for _, k := range sheet.Needs {
				if !slices.ContainsFunc(got.Route.Load, func(d Demand) bool { return d.Kind == k }) {
					t.Fatalf("the load has no %s\n%s", k, describe())
				}
			}
		}
		if x.steps < 0 {
			continue
		}
		compared++
		switch {
		case ok && got.Route == nil:
			t.Fatalf("there is a route of toll %v\n%s", want, describe())
		case ok && got.Route.Toll.Seconds > want*(1+slack) && got.Route.Proven:
			t.Fatalf("there is a route of toll %v\n%s", want, describe())
		case ok && got.Route.Toll.Seconds > want*(1+slack):
			t.Logf("not proven and not best: %s", describe())
		}
		if ok {
			reached++
			if o.MaxBytes > 0 || sheet.Needs != nil {
				limited++
			}
		}
	}
	t.Logf("%d graphs compared, %d with a route, %d of them under a limit or a need", compared, reached, limited)
	if compared < graphs/2 || reached < graphs/4 || limited < graphs/20 {
		t.Fatalf("too few graphs could be enumerated: %d of %d, %d with a route, %d under limits", compared, graphs, reached, limited)
	}
}
