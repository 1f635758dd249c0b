package endtoend

import (
	"context"
	"testing"
	"time"

	"towpath/backends"
	"towpath/backends/csdp"
	"towpath/backends/interior"
	"towpath/broker"
	"towpath/broker/wire"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/protobuf/types/known/durationpb"
)

// station is a broker under test, reached over gRPC.
type station struct {
	jobs   towpathv1.JobServiceClient
	routes towpathv1.RouteServiceClient
	csdp   bool // whether csdp is there
}

// newStation starts a broker with every back end that this machine has.
func newStation(t *testing.T) *station {
	t.Helper()
	drivers := []backends.Driver{interior.New()}
	path, ok := csdp.Find()
	if ok {
		drivers = append(drivers, csdp.New(path))
	} else {
		t.Logf("csdp is absent (Debian package %s): its routes are not tested", csdp.Package)
	}
	s := newStationOf(t, drivers...)
	s.csdp = ok
	return s
}

// newStationOf starts a broker with the given back ends.
func newStationOf(t *testing.T, drivers ...backends.Driver) *station {
	t.Helper()
	b, err := broker.New(broker.Config{}, drivers, nil, zap.NewNop())
	if err != nil {
		t.Fatal(err)
	}
	conn, closeAll, err := broker.NewServer(b).Embed()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(closeAll)
	return &station{jobs: towpathv1.NewJobServiceClient(conn), routes: towpathv1.NewRouteServiceClient(conn)}
}

// solve sends the model through gRPC and returns the answer, as sent and in the model's terms.
func (s *station) solve(t *testing.T, m *model.Model, o *towpathv1.JobOptions) (*towpathv1.Answer, *model.Answer) {
	t.Helper()
	ctx, cancel := context.WithTimeout(t.Context(), 5*time.Minute)
	defer cancel()
	submitted, err := s.jobs.SubmitJob(ctx, &towpathv1.SubmitJobRequest{
		Source: &towpathv1.SubmitJobRequest_Model{Model: wire.ModelToProto(m)}, Options: o,
	})
	if err != nil {
		t.Fatalf("submit: %v", err)
	}
	job := submitted.GetJob()
	for job.GetEndTime() == nil {
		r, err := s.jobs.GetJob(ctx, &towpathv1.GetJobRequest{JobId: job.GetId(), Wait: durationpb.New(30 * time.Second)})
		if err != nil {
			t.Fatalf("get: %v", err)
		}
		job = r.GetJob()
	}
	if job.GetState() != towpathv1.JobState_JOB_STATE_ANSWERED {
		t.Fatalf("the job is %v: %v", job.GetState(), job.GetFault())
	}
	stream, err := s.jobs.FetchAnswer(ctx, &towpathv1.FetchAnswerRequest{JobId: job.GetId()})
	if err != nil {
		t.Fatalf("fetch: %v", err)
	}
	sent, err := wire.ReceiveAnswer(stream.Recv)
	if err != nil {
		t.Fatalf("fetch: %v", err)
	}
	a, err := wire.AnswerFromProto(m, sent)
	if err != nil {
		t.Fatal(err)
	}
	return sent, a
}
