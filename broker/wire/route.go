package wire

import (
	"towpath/capability"
	towpathv1 "towpath/proto/towpath/v1"
)

// RouteToProto encodes a route.
func RouteToProto(r *capability.Route) *towpathv1.Route {
	if r == nil {
		return nil
	}
	out := &towpathv1.Route{
		Sheet: r.Sheet.Name, Backend: r.Sheet.Backend, Native: r.Native(), Proven: r.Proven, Doubt: r.Doubt,
		Toll:      &towpathv1.Toll{Seconds: r.Toll.Seconds, Bytes: r.Toll.Bytes},
		Exactness: exactnessToProto(r.Exactness), Legs: legsToProto(r.Legs), Load: DemandsToProto(r.Load),
	}
	for k, share := range r.Shares() {
		out.Legs[k].ShareSeconds = share.Seconds
	}
	return out
}

func exactnessToProto(e capability.Exactness) towpathv1.Exactness { return towpathv1.Exactness(e) + 1 }

func legsToProto(legs []capability.Leg) []*towpathv1.Leg {
	var out []*towpathv1.Leg
	for _, l := range legs {
		out = append(out, &towpathv1.Leg{Demand: demandToProto(l.Demand), Bridge: l.Bridge, Parts: legsToProto(l.Parts)})
	}
	return out
}

func demandToProto(d capability.Demand) *towpathv1.Demand {
	return &towpathv1.Demand{Kind: d.Kind.String(), Size: uint64(d.Size), Count: uint64(d.Count), Nonzeros: uint64(d.Nonzeros)}
}

// DemandsToProto encodes demands.
func DemandsToProto(demands []capability.Demand) []*towpathv1.Demand {
	var out []*towpathv1.Demand
	for _, d := range demands {
		out = append(out, demandToProto(d))
	}
	return out
}

// ProposalToProto encodes what planning found for one sheet.
func ProposalToProto(p *capability.Proposal) *towpathv1.Proposal {
	out := &towpathv1.Proposal{Sheet: p.Sheet.Name, Backend: p.Sheet.Backend, Text: p.String()}
	if p.Route == nil {
		out.Result = &towpathv1.Proposal_Unreachable{Unreachable: &towpathv1.Unreachable{Demands: DemandsToProto(p.Unreachable.Demands), Reasons: p.Unreachable.Reasons}}
		return out
	}
	out.Result = &towpathv1.Proposal_Route{Route: RouteToProto(p.Route)}
	for _, r := range p.RunnersUp {
		out.RunnersUp = append(out.RunnersUp, RouteToProto(r))
	}
	return out
}

// SheetToProto encodes a sheet, its kinds sorted by name.
func SheetToProto(s *capability.Sheet) *towpathv1.Sheet {
	out := &towpathv1.Sheet{
		Name: s.Name, Accuracy: s.Accuracy,
		ReturnsMultipliers:               s.Returns&capability.LiftsMultipliers != 0,
		ReturnsInfeasibilityCertificates: s.Returns&capability.LiftsInfeasibility != 0,
		ReturnsUnboundednessCertificates: s.Returns&capability.LiftsUnboundedness != 0,
	}
	for _, k := range s.Kinds() {
		out.Takes = append(out.Takes, &towpathv1.NativeKind{Kind: k.String(), LargestSize: uint64(s.Takes[k])})
	}
	return out
}
