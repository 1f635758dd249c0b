package wire

import (
	"strings"
	"testing"

	"towpath/backends/interior"
	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

// A route over bridges arrives as the planner made it: every leg, its parts, the load and the tolls.
func TestRoutesArriveWhole(t *testing.T) {
	m := &model.Model{
		Blocks: []model.Block{{Field: model.Hermitian, Rows: 3, Cols: 3, Cone: model.PSD}, {Field: model.Complex, Rows: 4, Cols: 1}},
		Constraints: []model.Constraint{{Cone: model.Cone{Kind: model.Zero}, Map: model.Map{Field: model.Complex,
			Lin: model.Matrix{Start: []int{0, 2}, Col: []uint32{0, 7}, Re: []float64{1, 1}}}}},
	}
	var rules []capability.Rule
	for _, b := range bridges.All() {
		rules = append(rules, b)
	}
	var sheets []*capability.Sheet
	for _, s := range interior.New().Sheets() {
		sheets = append(sheets, &s)
	}
	for _, p := range capability.Plan(capability.Summarize(m), rules, sheets, capability.Options{}) {
		if p.Route == nil {
			t.Fatalf("%s: %v", p.Sheet.Name, p.Unreachable.Reasons)
		}
		got := ProposalToProto(&p)
		r := got.GetRoute()
		if got.GetSheet() != p.Sheet.Name || got.GetBackend() != "interior" || !strings.HasPrefix(got.GetText(), p.Sheet.Name) || len(got.GetRunnersUp()) != len(p.RunnersUp) {
			t.Errorf("proposal %v", got)
		}
		if r.GetNative() != (p.Sheet.Name == interior.ComplexSheet) || r.GetProven() != p.Route.Proven || (r.GetDoubt() == "") != p.Route.Proven || r.GetExactness() != towpathv1.Exactness_EXACTNESS_EXACT {
			t.Errorf("route %v", r)
		}
		if r.GetToll().GetSeconds() != p.Route.Toll.Seconds || r.GetToll().GetBytes() != p.Route.Toll.Bytes {
			t.Errorf("toll %v, want %v", r.GetToll(), p.Route.Toll)
		}
		sameLegs(t, r.GetLegs(), p.Route.Legs)
		shares := p.Route.Shares()
		for k, l := range r.GetLegs() {
			if l.GetShareSeconds() != shares[k].Seconds {
				t.Errorf("share %g, want %g", l.GetShareSeconds(), shares[k].Seconds)
			}
		}
		if len(r.GetLoad()) != len(p.Route.Load) {
			t.Errorf("load %v", r.GetLoad())
		}
		for k, d := range p.Route.Load {
			sameDemand(t, r.GetLoad()[k], d)
		}
	}
	if RouteToProto(nil) != nil {
		t.Error("no route became one")
	}
}

func sameLegs(t *testing.T, got []*towpathv1.Leg, want []capability.Leg) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("%d legs, want %d", len(got), len(want))
	}
	for k, l := range want {
		sameDemand(t, got[k].GetDemand(), l.Demand)
		if got[k].GetBridge() != l.Bridge {
			t.Errorf("bridge %s, want %s", got[k].GetBridge(), l.Bridge)
		}
		sameLegs(t, got[k].GetParts(), l.Parts)
	}
}

func sameDemand(t *testing.T, got *towpathv1.Demand, want capability.Demand) {
	t.Helper()
	if got.GetKind() != want.Kind.String() || got.GetSize() != uint64(want.Size) || got.GetCount() != uint64(want.Count) || got.GetNonzeros() != uint64(want.Nonzeros) {
		t.Errorf("demand %v, want %v", got, want)
	}
}
