package broker

import (
	"cmp"
	"context"
	"fmt"
	"slices"

	"towpath/broker/wire"
	"towpath/capability"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// routeService serves towpath.v1.RouteService.
type routeService struct {
	towpathv1.UnimplementedRouteServiceServer
	b *Broker
}

// PlanRoutes implements towpathv1.RouteServiceServer.
func (s *routeService) PlanRoutes(ctx context.Context, q *towpathv1.PlanRoutesRequest) (*towpathv1.PlanRoutesResponse, error) {
	if err := validOptions(q.GetOptions()); err != nil {
		return nil, err
	}
	in, err := s.b.intake(ctx, q.GetModel(), q.GetModelId(), q.GetSource() != nil)
	if err != nil {
		return nil, err
	}
	proposals, err := s.b.planner.plan(in.demands, q.GetOptions(), s.b.cfg.MemoryLimit)
	if err != nil {
		return nil, err
	}
	out := &towpathv1.PlanRoutesResponse{Demands: wire.DemandsToProto(in.demands)}
	for i := range proposals {
		p := wire.ProposalToProto(&proposals[i])
		switch {
		case proposals[i].Route == nil:
			p.Reason = "out of reach"
		case i == 0:
			p.Chosen, p.Reason = true, "lowest toll"
		default:
			p.Reason = fmt.Sprintf("toll is %.3g times that of the chosen one", proposals[i].Route.Toll.Seconds/proposals[0].Route.Toll.Seconds)
		}
		out.Proposals = append(out.Proposals, p)
	}
	fit(out)
	return out, nil
}

// planBytes is what a plan may have, so that it fits into a message of gRPC's usual limit.
const planBytes = 3 << 20

// fit leaves out what a plan can do without, as far as it must: models of very many different sizes have long routes.
func fit(r *towpathv1.PlanRoutesResponse) {
	for _, drop := range []func(*towpathv1.Proposal){
		func(p *towpathv1.Proposal) { p.RunnersUp = nil },
		func(p *towpathv1.Proposal) { p.Text = "" },
		func(p *towpathv1.Proposal) {
			if !p.GetChosen() && p.GetRoute() != nil {
				p.GetRoute().Legs, p.GetRoute().Load = nil, nil
			}
		},
	} {
		if proto.Size(r) <= planBytes {
			return
		}
		for _, p := range r.GetProposals() {
			drop(p)
		}
	}
}

// ListBackends implements towpathv1.RouteServiceServer.
func (s *routeService) ListBackends(context.Context, *towpathv1.ListBackendsRequest) (*towpathv1.ListBackendsResponse, error) {
	byName := map[string]*towpathv1.Backend{}
	for _, sheet := range s.b.planner.sheets {
		b := byName[sheet.Backend]
		if b == nil {
			b = &towpathv1.Backend{Name: sheet.Backend, Version: sheet.Version, Available: true}
			byName[sheet.Backend] = b
		}
		b.Sheets = append(b.Sheets, wire.SheetToProto(sheet))
	}
	out := &towpathv1.ListBackendsResponse{}
	for _, b := range byName {
		out.Backends = append(out.Backends, b)
	}
	for _, a := range s.b.absent {
		out.Backends = append(out.Backends, &towpathv1.Backend{Name: a.Backend, UnavailableReason: a.Cure})
	}
	slices.SortFunc(out.Backends, func(a, b *towpathv1.Backend) int { return cmp.Compare(a.GetName(), b.GetName()) })
	return out, nil
}

// GetCapabilityGraph implements towpathv1.RouteServiceServer.
func (s *routeService) GetCapabilityGraph(context.Context, *towpathv1.GetCapabilityGraphRequest) (*towpathv1.GetCapabilityGraphResponse, error) {
	g := capability.GraphOf(s.b.planner.rules, s.b.planner.sheets)
	out := &towpathv1.GetCapabilityGraphResponse{Text: g.String()}
	for _, k := range g.Kinds {
		out.Kinds = append(out.Kinds, k.String())
	}
	sources := map[string]string{}
	for _, b := range s.b.planner.catalogue {
		sources[b.ID()] = b.Source()
	}
	for _, e := range g.Edges {
		info := &towpathv1.BridgeInfo{Id: e.Bridge, From: e.From.String(), Exactness: towpathv1.Exactness(e.Exactness) + 1, Source: sources[e.Bridge]}
		for _, k := range e.To {
			info.To = append(info.To, k.String())
		}
		out.Bridges = append(out.Bridges, info)
	}
	for _, sheet := range g.Sheets {
		out.Sheets = append(out.Sheets, wire.SheetToProto(sheet))
	}
	return out, nil
}
