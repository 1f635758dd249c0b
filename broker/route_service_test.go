package broker

import (
	"errors"
	"io"
	"slices"
	"strings"
	"testing"

	"towpath/backends"
	"towpath/backends/interior"
	"towpath/bridges"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/health/grpc_health_v1"
	reflectionv1 "google.golang.org/grpc/reflection/grpc_reflection_v1"
	"google.golang.org/protobuf/proto"
)

// Planning tells every sheet's route or why there is none, the chosen one first, and solves nothing.
func TestPlanRoutes(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 2, panicking}, &puppet{"barge", 1, panicking}, interior.New())
	m := smallest()
	m.Blocks = append(m.Blocks, &towpathv1.Block{Name: "W", Field: towpathv1.Field_FIELD_HERMITIAN, Rows: 3, Cone: towpathv1.Cone_CONE_PSD})
	r, err := s.routes.PlanRoutes(s.ctx(), &towpathv1.PlanRoutesRequest{Source: &towpathv1.PlanRoutesRequest_Model{Model: m}})
	if err != nil {
		t.Fatal(err)
	}
	var kinds []string
	for _, d := range r.GetDemands() {
		kinds = append(kinds, d.GetKind())
	}
	if want := []string{"block/hermitian/psd", "block/real/nonneg", "map/real/nonneg"}; !slices.Equal(sorted(kinds), want) {
		t.Errorf("demands %v, want %v", kinds, want)
	}
	p := r.GetProposals()
	if len(p) != 4 || !p[0].GetChosen() || p[0].GetSheet() != interior.ComplexSheet || !p[0].GetRoute().GetNative() || p[0].GetReason() != "lowest toll" || p[0].GetText() == "" {
		t.Fatalf("proposals %v", p)
	}
	if p[1].GetSheet() != interior.RealSheet || p[1].GetChosen() || p[1].GetRoute().GetNative() || !strings.HasPrefix(p[1].GetReason(), "toll is ") {
		t.Errorf("second is %v", p[1])
	}
	for _, out := range p[2:] {
		u := out.GetUnreachable()
		if len(u.GetReasons()) == 0 || len(u.GetDemands()) != 1 || u.GetDemands()[0].GetKind() != "block/hermitian/psd" || u.GetDemands()[0].GetSize() != 3 || out.GetReason() != "out of reach" {
			t.Errorf("out of reach: %v", out)
		}
	}
	if jobs, err := s.jobs.ListJobs(s.ctx(), &towpathv1.ListJobsRequest{}); err != nil || len(jobs.GetJobs()) != 0 {
		t.Errorf("planning made jobs: %v (%v)", jobs, err)
	}
}

// Of two equal sheets the smaller name is chosen, whatever the order of registration.
func TestTiesGoToTheSmallerName(t *testing.T) {
	a, b := &puppet{"a", 1, honestly}, &puppet{"b", 1, honestly}
	for name, drivers := range map[string][]backends.Driver{"a first": {a, b}, "b first": {b, a}} {
		t.Run(name, func(t *testing.T) {
			s := newStation(t, Config{}, drivers...)
			r, err := s.routes.PlanRoutes(s.ctx(), &towpathv1.PlanRoutesRequest{Source: &towpathv1.PlanRoutesRequest_Model{Model: smallest()}})
			if err != nil || r.GetProposals()[0].GetSheet() != "a/real" {
				t.Errorf("chosen %v (%v)", r.GetProposals(), err)
			}
		})
	}
}

func TestListBackends(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly}, interior.New())
	r, err := s.routes.ListBackends(s.ctx(), &towpathv1.ListBackendsRequest{})
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, b := range r.GetBackends() {
		names = append(names, b.GetName())
		if (b.GetName() == "ferry") == b.GetAvailable() {
			t.Errorf("%s is available: %v", b.GetName(), b.GetAvailable())
		}
	}
	if !slices.Equal(names, []string{"ferry", "interior", "tug"}) {
		t.Errorf("back ends %v", names)
	}
	if why := r.GetBackends()[0].GetUnavailableReason(); why != "install the Debian package ferry" {
		t.Errorf("ferry is missing: %s", why)
	}
	sheet := r.GetBackends()[2].GetSheets()[0]
	if sheet.GetName() != "tug/real" || len(sheet.GetTakes()) != 4 || !sheet.GetReturnsMultipliers() || !sheet.GetReturnsInfeasibilityCertificates() || !sheet.GetReturnsUnboundednessCertificates() {
		t.Errorf("sheet %v", sheet)
	}
	if len(r.GetBackends()[1].GetSheets()) != 2 {
		t.Errorf("the engine has %d sheets", len(r.GetBackends()[1].GetSheets()))
	}
}

func TestCapabilityGraph(t *testing.T) {
	s := newStation(t, Config{}, interior.New())
	r, err := s.routes.GetCapabilityGraph(s.ctx(), &towpathv1.GetCapabilityGraphRequest{})
	if err != nil {
		t.Fatal(err)
	}
	if len(r.GetBridges()) != len(bridges.All()) || !slices.IsSorted(r.GetKinds()) || r.GetText() == "" || len(r.GetSheets()) != 2 {
		t.Errorf("%d bridges of %d, %d sheets", len(r.GetBridges()), len(bridges.All()), len(r.GetSheets()))
	}
	for _, b := range r.GetBridges() {
		if b.GetSource() == "" || len(b.GetTo()) == 0 || b.GetExactness() == towpathv1.Exactness_EXACTNESS_UNSPECIFIED {
			t.Errorf("bridge %v", b)
		}
	}
}

// A model of a few bytes that would take more memory than there is goes nowhere.
func TestMemoryIsCountedBeforehand(t *testing.T) {
	s := newStation(t, Config{}, interior.New())
	m := smallest()
	m.Blocks = append(m.Blocks, &towpathv1.Block{Field: towpathv1.Field_FIELD_HERMITIAN, Rows: 90_000, Cone: towpathv1.Cone_CONE_PSD})
	_, err := s.try(m, nil)
	refused(t, err, codes.FailedPrecondition, NoRoute, "are allowed")
}

// The standard services are there: health by service name, and reflection.
func TestStandardServices(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	for _, name := range []string{"", "towpath.v1.JobService", "towpath.v1.RouteService"} {
		r, err := grpc_health_v1.NewHealthClient(s.conn).Check(s.ctx(), &grpc_health_v1.HealthCheckRequest{Service: name})
		if err != nil || r.GetStatus() != grpc_health_v1.HealthCheckResponse_SERVING {
			t.Errorf("health of '%s': %v (%v)", name, r, err)
		}
	}
	stream, err := reflectionv1.NewServerReflectionClient(s.conn).ServerReflectionInfo(s.ctx())
	if err != nil {
		t.Fatal(err)
	}
	ask := &reflectionv1.ServerReflectionRequest{MessageRequest: &reflectionv1.ServerReflectionRequest_ListServices{}}
	if err := stream.Send(ask); err != nil {
		t.Fatal(err)
	}
	r, err := stream.Recv()
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, x := range r.GetListServicesResponse().GetService() {
		names = append(names, x.GetName())
	}
	if !slices.Contains(names, "towpath.v1.JobService") || !slices.Contains(names, "towpath.v1.RouteService") {
		t.Errorf("services %v", names)
	}
	if err := stream.CloseSend(); err != nil {
		t.Fatal(err)
	}
	if _, err := stream.Recv(); !errors.Is(err, io.EOF) {
		t.Errorf("the stream ended with %v", err)
	}
}

// A plan of very many sizes leaves out what it can do without, and keeps the chosen route.
func TestPlansFitIntoMessages(t *testing.T) {
	long := func() *towpathv1.Route {
		r := &towpathv1.Route{Sheet: "s"}
		for range 10_000 {
			r.Legs = append(r.Legs, &towpathv1.Leg{Bridge: strings.Repeat("b", 40), Demand: &towpathv1.Demand{Kind: "block/hermitian/psd"}})
		}
		return r
	}
	r := &towpathv1.PlanRoutesResponse{}
	for k := range 5 {
		p := &towpathv1.Proposal{Sheet: "s", Chosen: k == 0, Text: strings.Repeat("t", 1<<20), Result: &towpathv1.Proposal_Route{Route: long()}, RunnersUp: []*towpathv1.Route{long()}}
		r.Proposals = append(r.Proposals, p)
	}
	fit(r)
	if n := proto.Size(r); n > planBytes {
		t.Errorf("%d bytes", n)
	}
	if n := len(r.GetProposals()[0].GetRoute().GetLegs()); n != 10_000 || len(r.GetProposals()) != 5 {
		t.Errorf("%d proposals, the chosen one with %d legs", len(r.GetProposals()), n)
	}
	small := &towpathv1.PlanRoutesResponse{Proposals: []*towpathv1.Proposal{{Text: "t", RunnersUp: []*towpathv1.Route{{}}}}}
	if fit(small); small.GetProposals()[0].GetText() == "" || len(small.GetProposals()[0].GetRunnersUp()) != 1 {
		t.Error("a small plan lost something")
	}
}
