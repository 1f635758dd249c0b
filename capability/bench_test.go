package capability_test

import (
	"fmt"
	"testing"

	. "towpath/capability"
	"towpath/model"
)

// readCatalogue reads a catalogue of the size of the real one, and its first two sheets.
func readCatalogue(b testing.TB) (rules []Rule, sheets []*Sheet) {
	p, err := readPlanFile("testdata/catalogue.txt")
	if err != nil {
		b.Fatal(err)
	}
	for _, r := range p.rules {
		rules = append(rules, r)
	}
	return rules, p.sheets[:2]
}

// tenSheets makes ten sheets of two, each without some of the kinds.
func tenSheets(two []*Sheet) []*Sheet {
	var out []*Sheet
	for i := range 5 {
		for _, s := range two {
			takes := map[Kind]int{}
			for j, k := range s.Kinds() {
				if i == 0 || k.Field == model.Real || k.Field == model.Symmetric || (i+j)%4 != 0 {
					takes[k] = 0
				}
			}
			other := *s
			other.Name, other.Takes = fmt.Sprintf("%s-%d", s.Name, i), takes
			out = append(out, &other)
		}
	}
	return out
}

// tenDemands is what a model of moderate size asks for.
func tenDemands() []Demand {
	return []Demand{
		{Kind: Kind{OnBlock, model.Hermitian, model.PSD}, Size: 14, Count: 1},
		{Kind: Kind{OnBlock, model.Hermitian, model.PSD}, Size: 2, Count: 20},
		{Kind: Kind{OnBlock, model.Real, model.Free}, Size: 1, Count: 10},
		{Kind: Kind{OnBlock, model.Complex, model.Free}, Size: 1, Count: 30},
		{Kind: Kind{OnMap, model.Hermitian, model.PSD}, Size: 5, Count: 3},
		{Kind: Kind{OnMap, model.Complex, model.Lorentz}, Size: 2, Count: 40},
		{Kind: Kind{OnMap, model.Complex, model.Zero}, Size: 1, Count: 14},
		{Kind: Kind{OnMap, model.Real, model.RotatedLorentz}, Size: 4, Count: 5},
		{Kind: Kind{OnMap, model.Real, model.Range}, Size: 1, Count: 28},
		{Kind: Kind{OnBounds, model.Complex, model.Box}, Size: 1, Count: 60},
	}
}

func thousandDemands(kinds ...Kind) []Demand {
	var out []Demand
	for i := range 1000 {
		out = append(out, Demand{Kind: kinds[i%len(kinds)], Size: 3 + i/len(kinds), Count: 1 + i%7})
	}
	return out
}

func benchPlan(b *testing.B, demands []Demand, n int) {
	rules, sheets := readCatalogue(b)
	sheets = tenSheets(sheets)[:n]
	proven, routes := 0, 0
	for b.Loop() {
		proven, routes = 0, 0
		for _, p := range Plan(demands, rules, sheets, Options{}) {
			if p.Route == nil {
				b.Fatal(p.String())
			}
			routes++
			if p.Route.Proven {
				proven++
			}
		}
	}
	b.ReportMetric(float64(proven)/float64(routes), "proven/route")
}

func BenchmarkTenDemandsTenSheets(b *testing.B) { benchPlan(b, tenDemands(), 10) }

func BenchmarkThousandSizes(b *testing.B) {
	block, rows := Kind{OnBlock, model.Hermitian, model.PSD}, Kind{OnMap, model.Hermitian, model.PSD}
	for _, sheets := range []int{1, 2, 10} {
		b.Run(fmt.Sprintf("one-kind-%d-sheets", sheets), func(b *testing.B) { benchPlan(b, thousandDemands(block), sheets) })
		b.Run(fmt.Sprintf("two-kinds-%d-sheets", sheets), func(b *testing.B) { benchPlan(b, thousandDemands(block, rows), sheets) })
	}
}
