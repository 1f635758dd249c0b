package broker

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/types/known/durationpb"
)

// Many clients at once submit, watch, withdraw, list, fetch and leave, over back ends that solve, fail, panic and dawdle,
// until the server stops under them. Every job that was accepted ends exactly once, and nothing is left.
func TestStorm(t *testing.T) {
	const clients, rounds, seed = 12, 40, 17
	var count atomic.Int64
	mood := func(ctx context.Context, _ *model.Model, o backends.Options) (*model.Answer, error) {
		switch n := count.Add(1); n % 7 {
		case 0:
			return nil, errors.New("out of coal")
		case 1:
			panic("boiler")
		case 2:
			select {
			case <-ctx.Done():
			case <-time.After(time.Duration(n%5) * time.Millisecond):
			}
		}
		o.Progress(backends.Progress{Iteration: 1})
		return right(), nil
	}
	s := newStation(t, Config{Workers: 4, QueueLimit: 30, Retain: clients * rounds, Grace: 5 * time.Millisecond}, &puppet{"tug", 1, mood}, &puppet{"barge", 2, mood})
	var mu sync.Mutex
	accepted := map[string]bool{}
	var answered atomic.Int64
	var all sync.WaitGroup
	for c := range clients {
		all.Go(func() {
			r := rand.New(rand.NewPCG(seed, uint64(c)))
			for k := range rounds {
				m := smallest()
				m.Name = fmt.Sprint(r.IntN(10))
				o := &towpathv1.JobOptions{}
				if r.IntN(5) == 0 {
					o.LifeLimit = durationpb.New(time.Duration(1+r.IntN(3)) * time.Millisecond)
				}
				job, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: m}, Options: o, RequestId: fmt.Sprint(c, " ", k)})
				switch code := status.Code(err); code {
				case codes.OK:
				case codes.ResourceExhausted, codes.Unavailable, codes.Canceled:
					continue
				default:
					t.Errorf("submit: %v", err)
					continue
				}
				id := job.GetJob().GetId()
				mu.Lock()
				accepted[id] = true
				mu.Unlock()
				switch r.IntN(4) {
				case 0:
					_, _ = s.jobs.WithdrawJob(s.ctx(), &towpathv1.WithdrawJobRequest{JobId: id}) // the server may stop meanwhile
				case 1:
					if events, err := s.watch(id, 0); err == nil && !ended(statesOf(events)[len(statesOf(events))-1]) {
						t.Errorf("a stream ended with the states %v", statesOf(events))
					}
				case 2:
					got, err := s.jobs.GetJob(s.ctx(), &towpathv1.GetJobRequest{JobId: id, Wait: durationpb.New(patience)})
					if err == nil && got.GetJob().GetState() == towpathv1.JobState_JOB_STATE_ANSWERED {
						if a, err := s.fetch(id); err == nil && a.GetExamination().GetVerdict() == towpathv1.Verdict_VERDICT_CHECKED {
							answered.Add(1)
						}
					}
				case 3:
					ctx, cancel := context.WithTimeout(context.Background(), time.Duration(r.IntN(2000))*time.Microsecond)
					_, _ = s.jobs.ListJobs(ctx, &towpathv1.ListJobsRequest{PageSize: 5}) // somebody who leaves
					cancel()
				}
			}
		})
	}
	s.eventually("the midst of the storm", func() bool { return count.Load() > clients*rounds/4 })
	s.server.Stop()
	all.Wait()
	ends := map[string]int{}
	for _, line := range s.log.FilterMessage("job changed").All() {
		fields := line.ContextMap()
		switch fields["state"] {
		case "answered", "failed", "withdrawn", "expired":
			ends[fmt.Sprint(fields["job"])]++
		}
	}
	for id := range accepted {
		if ends[id] != 1 {
			t.Errorf("job %s ended %d times", id, ends[id])
		}
	}
	if len(accepted) < clients || answered.Load() == 0 {
		t.Errorf("only %d jobs were accepted and %d answers fetched: the storm is a breeze (seed %d)", len(accepted), answered.Load(), seed)
	}
	for id := range s.b.live {
		r, _, err := s.b.get(t.Context(), id)
		if err != nil || !ended(r.Job.GetState()) {
			t.Errorf("job %s is left as %v (%v)", id, r, err)
		}
	}
	s.b.mu.Lock()
	defer s.b.mu.Unlock()
	for id, use := range s.b.models {
		if use.jobs != 0 {
			t.Errorf("model %s is still used by %d jobs", id, use.jobs)
		}
	}
}
