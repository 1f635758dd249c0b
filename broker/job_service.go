package broker

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"time"

	"towpath/broker/store"
	"towpath/broker/wire"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/proto"
)

// jobService serves towpath.v1.JobService.
type jobService struct {
	towpathv1.UnimplementedJobServiceServer
	b *Broker
}

// SubmitJob implements towpathv1.JobServiceServer.
func (s *jobService) SubmitJob(ctx context.Context, q *towpathv1.SubmitJobRequest) (*towpathv1.SubmitJobResponse, error) {
	if err := validSubmit(q); err != nil {
		return nil, err
	}
	job, err := s.b.submit(ctx, q)
	if err != nil {
		return nil, err
	}
	return &towpathv1.SubmitJobResponse{Job: job}, nil
}

// GetJob implements towpathv1.JobServiceServer.
func (s *jobService) GetJob(ctx context.Context, q *towpathv1.GetJobRequest) (*towpathv1.GetJobResponse, error) {
	wait, err := validWait(q.GetWait())
	if err != nil {
		return nil, err
	}
	r, _, err := s.b.get(ctx, q.GetJobId())
	if err != nil {
		return nil, err
	}
	if l := s.b.liveJob(q.GetJobId()); l != nil && wait > 0 && !ended(r.Job.GetState()) {
		timer := time.NewTimer(wait)
		defer timer.Stop()
		select {
		case <-l.done:
		case <-timer.C:
		case <-s.b.drained:
		case <-ctx.Done():
			return nil, ctx.Err()
		}
		if r, _, err = s.b.get(ctx, q.GetJobId()); err != nil {
			return nil, err
		}
	}
	return &towpathv1.GetJobResponse{Job: s.b.explained(r.Job)}, nil
}

func (b *Broker) liveJob(id string) *liveJob {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.live[id]
}

// explained says why a waiting job waits.
func (b *Broker) explained(job *towpathv1.Job) *towpathv1.Job {
	if job.GetState() != towpathv1.JobState_JOB_STATE_WAITING {
		return job
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	if k := slices.Index(b.queue, job.GetId()); k >= 0 {
		job.WaitingReason = fmt.Sprintf("all %d workers are busy; %d jobs are before this one", b.cfg.Workers, k)
	}
	return job
}

// FetchAnswer implements towpathv1.JobServiceServer.
func (s *jobService) FetchAnswer(q *towpathv1.FetchAnswerRequest, stream grpc.ServerStreamingServer[towpathv1.FetchAnswerResponse]) error {
	ctx := stream.Context()
	r, _, err := s.b.get(ctx, q.GetJobId())
	if err != nil {
		return err
	}
	if r.Answer == "" {
		why := "wait for it to end"
		if ended(r.Job.GetState()) {
			why = r.Job.GetFault().GetMessage()
		}
		return refuse(codes.FailedPrecondition, NoAnswer, "job '%s' is %s and has no answer: %s", q.GetJobId(), word(r.Job.GetState()), why)
	}
	raw, err := s.b.blobs.Get(ctx, r.Answer)
	if errors.Is(err, store.ErrMissing) {
		if _, _, gone := s.b.get(ctx, q.GetJobId()); gone != nil { // forgotten meanwhile
			return gone
		}
	}
	if err != nil {
		return err
	}
	a := &towpathv1.Answer{}
	if err := proto.Unmarshal(raw, a); err != nil {
		return err
	}
	return wire.SendAnswer(a, stream.Send)
}

// WithdrawJob implements towpathv1.JobServiceServer.
func (s *jobService) WithdrawJob(ctx context.Context, q *towpathv1.WithdrawJobRequest) (*towpathv1.WithdrawJobResponse, error) {
	r, err := s.b.settle(q.GetJobId(), towpathv1.JobState_JOB_STATE_WITHDRAWN, Withdrawn, "withdrawn by the client")
	if err != nil && !errors.Is(err, errEnded) {
		return nil, err
	}
	return &towpathv1.WithdrawJobResponse{Job: r.Job}, nil
}
