package broker

import (
	"context"
	"errors"
	"io"
	"sync"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/health/grpc_health_v1"
	"google.golang.org/grpc/status"
)

// serving asks the health service about the whole server.
func (s *station) serving() grpc_health_v1.HealthCheckResponse_ServingStatus {
	s.t.Helper()
	r, err := grpc_health_v1.NewHealthClient(s.conn).Check(s.ctx(), &grpc_health_v1.HealthCheckRequest{})
	if err != nil {
		s.t.Fatal(err)
	}
	return r.GetStatus()
}

// A drain in order: not serving, no new jobs, waiting jobs fail at once, the running one finishes, streams end.
func TestDrain(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Workers: 1, Grace: patience}, &puppet{"tug", 1, h.solve})
	if got := s.serving(); got != grpc_health_v1.HealthCheckResponse_SERVING {
		t.Errorf("before: %v", got)
	}
	running := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	waiting := s.submit(smallest(), nil)
	stream, err := s.jobs.WatchJob(s.ctx(), &towpathv1.WatchJobRequest{JobId: running})
	if err != nil {
		t.Fatal(err)
	}
	first, err := stream.Recv() // the stream is there before the server stops
	if err != nil {
		t.Fatal(err)
	}
	watched := make(chan error, 1)
	states := statesOf([]*towpathv1.WatchJobResponse{first})
	go func() {
		for {
			e, err := stream.Recv()
			if err != nil {
				watched <- err
				return
			}
			states = append(states, statesOf([]*towpathv1.WatchJobResponse{e})...)
		}
	}()
	var stops sync.WaitGroup
	for range 2 { // twice at once, and a third time by the test's end
		stops.Go(s.server.Stop)
	}
	job := s.wait(waiting, towpathv1.JobState_JOB_STATE_FAILED)
	if job.GetFault().GetReason() != "DRAINED" {
		t.Errorf("fault %v", job.GetFault())
	}
	if got := s.serving(); got != grpc_health_v1.HealthCheckResponse_NOT_SERVING {
		t.Errorf("while draining: %v", got)
	}
	_, err = s.try(smallest(), nil)
	refused(t, err, codes.Unavailable, Draining, "the server is stopping; try again")
	close(h.finish)
	if err := <-watched; !errors.Is(err, io.EOF) {
		t.Errorf("the stream ended with %v", err)
	}
	if len(states) == 0 || states[len(states)-1] != towpathv1.JobState_JOB_STATE_ANSWERED {
		t.Errorf("the states seen are %v", states)
	}
	stops.Wait()
	s.server.Stop()
}

// A solve that outlasts the grace is stopped; whoever watches learns how the job ended.
func TestDrainStopsWhatTakesTooLong(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Grace: 20 * time.Millisecond}, &puppet{"tug", 1, h.solve})
	id := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	stream, err := s.jobs.WatchJob(s.ctx(), &towpathv1.WatchJobRequest{JobId: id})
	if err != nil {
		t.Fatal(err)
	}
	last, err := stream.Recv() // the stream is there before the server stops
	if err != nil {
		t.Fatal(err)
	}
	start := time.Now()
	s.server.Stop()
	if took := time.Since(start); took > deaf/2 {
		t.Errorf("stopping took %v although the back end obeys", took)
	}
	s.signal(h.ended, "the end of the solve")
	for {
		e, err := stream.Recv()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			t.Fatalf("the stream ended with %v", err)
		}
		last = e
	}
	if job := last.GetJob(); job.GetState() != towpathv1.JobState_JOB_STATE_FAILED || job.GetFault().GetReason() != "DRAINED" {
		t.Errorf("the watcher saw %v at last", last)
	}
}

// A stream whose job has not ended when the server stops (as when its record cannot be written) says where to go on.
func TestDrainEndsStreamsOfJobsThatGoOn(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	l := &liveJob{feed: newFeed(), done: make(chan struct{})}
	l.feed.state(&towpathv1.Job{Id: "ghost"}, time.Now(), false)
	s.b.mu.Lock()
	s.b.live["ghost"] = l
	s.b.mu.Unlock()
	stream, err := s.jobs.WatchJob(s.ctx(), &towpathv1.WatchJobRequest{JobId: "ghost"})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := stream.Recv(); err != nil {
		t.Fatal(err)
	}
	s.server.Stop()
	_, err = stream.Recv()
	refused(t, err, codes.Unavailable, Draining, "the server is stopping; watch again after sequence 1")
}

// A back end that does not obey delays the stop, but does not prevent it; its job fails all the same.
func TestDrainPassesDeafBackEnds(t *testing.T) {
	if testing.Short() {
		t.Skip("waits for the patience with back ends to run out")
	}
	began, let := make(chan struct{}), make(chan struct{})
	s := newStation(t, Config{Workers: 1, Grace: time.Millisecond}, &puppet{"deaf", 1, func(context.Context, *model.Model, backends.Options) (*model.Answer, error) {
		close(began)
		<-let
		return right(), nil
	}})
	id := s.submit(smallest(), nil)
	s.signal(began, "the solve")
	events := make(chan []*towpathv1.WatchJobResponse, 1)
	go func() {
		e, _ := s.watch(id, 0)
		events <- e
	}()
	start := time.Now()
	s.server.Stop()
	if took := time.Since(start); took > deaf+closing+2*time.Second {
		t.Errorf("stopping took %v", took)
	}
	states := statesOf(<-events)
	if len(states) == 0 || states[len(states)-1] != towpathv1.JobState_JOB_STATE_FAILED {
		t.Errorf("the watcher saw %v", states)
	}
	if s.log.FilterMessage("a back end goes on although it was told to stop").Len() != 1 {
		t.Error("the log does not say why stopping took so long")
	}
	close(let)
}

// An idle broker stops at once, and an upload that goes on does not hold it up.
func TestDrainEndsUploads(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	stream, err := s.jobs.UploadModel(s.ctx())
	if err != nil {
		t.Fatal(err)
	}
	if err := stream.Send(&towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Head{Head: smallest()}}); err != nil {
		t.Fatal(err)
	}
	s.answer(smallest(), nil) // the upload's call has reached the server before
	start := time.Now()
	s.server.Stop()
	if took := time.Since(start); took > closing/2 {
		t.Errorf("stopping took %v", took)
	}
	_, err = stream.CloseAndRecv()
	if code := status.Code(err); code != codes.Unavailable {
		t.Errorf("the upload ended with %v", err)
	}
}
