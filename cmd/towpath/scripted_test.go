package main

import (
	"context"
	"net"
	"sync"
	"testing"

	"towpath/broker/wire"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/credentials/insecure"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/proto"
)

// scripted is a broker that does what a test says: for situations that a real one is rarely in.
type scripted struct {
	towpathv1.UnimplementedJobServiceServer
	towpathv1.UnimplementedRouteServiceServer

	mu        sync.Mutex
	submitted []*towpathv1.SubmitJobRequest
	planned   []*towpathv1.PlanRoutesRequest
	uploaded  []*towpathv1.Model
	withdrawn []string
	listed    []*towpathv1.ListJobsRequest
	watched   []uint64 // after_sequence of every watch

	refuse  error                                                                 // of SubmitJob
	get     func() (*towpathv1.Job, error)                                        // of GetJob
	watch   func(attempt int, send func(*towpathv1.WatchJobResponse) error) error // of WatchJob
	answer  []*towpathv1.FetchAnswerResponse
	pages   []*towpathv1.ListJobsResponse
	running chan struct{} // closed when somebody waits for a job
}

// serve starts the broker on a port of this machine and returns its address.
func (s *scripted) serve(t *testing.T) string {
	t.Helper()
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	server := grpc.NewServer(grpc.Creds(insecure.NewCredentials()))
	towpathv1.RegisterJobServiceServer(server, s)
	towpathv1.RegisterRouteServiceServer(server, s)
	done := make(chan struct{})
	go func() {
		defer close(done)
		server.Serve(listener)
	}()
	t.Cleanup(func() { server.Stop(); <-done })
	return listener.Addr().String()
}

// streamOf sends an answer as a broker does and returns its messages.
func streamOf(t *testing.T, a *towpathv1.Answer) (messages []*towpathv1.FetchAnswerResponse) {
	t.Helper()
	err := wire.SendAnswer(proto.Clone(a).(*towpathv1.Answer), func(m *towpathv1.FetchAnswerResponse) error {
		messages = append(messages, m)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return messages
}

func (s *scripted) SubmitJob(_ context.Context, r *towpathv1.SubmitJobRequest) (*towpathv1.SubmitJobResponse, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.submitted = append(s.submitted, r)
	if s.refuse != nil {
		return nil, s.refuse
	}
	return &towpathv1.SubmitJobResponse{Job: &towpathv1.Job{Id: "j1", State: towpathv1.JobState_JOB_STATE_WAITING}}, nil
}

func (s *scripted) PlanRoutes(_ context.Context, r *towpathv1.PlanRoutesRequest) (*towpathv1.PlanRoutesResponse, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.planned = append(s.planned, r)
	return &towpathv1.PlanRoutesResponse{}, nil
}

func (s *scripted) UploadModel(stream grpc.ClientStreamingServer[towpathv1.UploadModelRequest, towpathv1.UploadModelResponse]) error {
	m, err := wire.ReceiveModel(stream.Recv, 1<<30, func(uint64) error { return nil })
	if err != nil {
		return err
	}
	s.mu.Lock()
	s.uploaded = append(s.uploaded, m)
	s.mu.Unlock()
	return stream.SendAndClose(&towpathv1.UploadModelResponse{ModelId: "m1"})
}

func (s *scripted) GetJob(ctx context.Context, r *towpathv1.GetJobRequest) (*towpathv1.GetJobResponse, error) {
	if s.running != nil {
		close(s.running)
		<-ctx.Done()
		return nil, status.FromContextError(ctx.Err()).Err()
	}
	job, err := s.get()
	return &towpathv1.GetJobResponse{Job: job}, err
}

func (s *scripted) WatchJob(r *towpathv1.WatchJobRequest, stream grpc.ServerStreamingServer[towpathv1.WatchJobResponse]) error {
	s.mu.Lock()
	s.watched = append(s.watched, r.GetAfterSequence())
	attempt := len(s.watched)
	s.mu.Unlock()
	return s.watch(attempt, stream.Send)
}

func (s *scripted) FetchAnswer(_ *towpathv1.FetchAnswerRequest, stream grpc.ServerStreamingServer[towpathv1.FetchAnswerResponse]) error {
	for _, m := range s.answer {
		if err := stream.Send(m); err != nil {
			return err
		}
	}
	return nil
}

func (s *scripted) WithdrawJob(_ context.Context, r *towpathv1.WithdrawJobRequest) (*towpathv1.WithdrawJobResponse, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.withdrawn = append(s.withdrawn, r.GetJobId())
	return &towpathv1.WithdrawJobResponse{Job: &towpathv1.Job{Id: r.GetJobId(), State: towpathv1.JobState_JOB_STATE_WITHDRAWN}}, nil
}

func (s *scripted) ListJobs(_ context.Context, r *towpathv1.ListJobsRequest) (*towpathv1.ListJobsResponse, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.listed = append(s.listed, r)
	return s.pages[len(s.listed)-1], nil
}
