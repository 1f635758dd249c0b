package broker

import (
	"context"
	"slices"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
)

func TestWatchFromTheBeginningAndResumed(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{}, &puppet{"tug", 1, h.solve})
	id := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	type result struct {
		events []*towpathv1.WatchJobResponse
		err    error
	}
	watched := make(chan result, 1)
	go func() {
		events, err := s.watch(id, 0)
		watched <- result{events, err}
	}()
	close(h.finish)
	all := <-watched
	if all.err != nil || !slices.Equal(statesOf(all.events), wholeLife) {
		t.Fatalf("states %v (%v)", statesOf(all.events), all.err)
	}
	for k, e := range all.events {
		if k > 0 && e.GetSequence() <= all.events[k-1].GetSequence() {
			t.Errorf("sequence %d after %d", e.GetSequence(), all.events[k-1].GetSequence())
		}
		if e.GetTime() == nil {
			t.Errorf("event %d has no time", k)
		}
		// Taken up again after any event: exactly what follows.
		rest, err := s.watch(id, e.GetSequence())
		if err != nil || !slices.Equal(statesOf(rest), wholeLife[k+1:]) {
			t.Errorf("after %d: %v (%v), want %v", e.GetSequence(), statesOf(rest), err, wholeLife[k+1:])
		}
	}
	_, err := s.watch(id, 99)
	refused(t, err, codes.InvalidArgument, RequestInvalid, "the request: after_sequence is 99 and the job's last event has 4; use the sequence of an earlier event, or 0")
	_, err = s.watch("no-such-job", 0)
	refused(t, err, codes.NotFound, UnknownJob, "there is no job 'no-such-job'; ended jobs are kept for a while only")
}

func TestIdleEvents(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Idle: 5 * time.Millisecond}, &puppet{"tug", 1, h.solve})
	id := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	stream, err := s.jobs.WatchJob(s.ctx(), &towpathv1.WatchJobRequest{JobId: id})
	if err != nil {
		t.Fatal(err)
	}
	idle, last := 0, uint64(0)
	for idle < 3 {
		e, err := stream.Recv()
		if err != nil {
			t.Fatal(err)
		}
		if e.GetIdle() != nil {
			idle++
			if e.GetSequence() != last {
				t.Errorf("idle after %d says %d", last, e.GetSequence())
			}
		}
		last = e.GetSequence()
	}
	close(h.finish)
}

// Progress arrives with its numbers, and at most five times a second.
func TestProgressIsThinned(t *testing.T) {
	const steps = 2000
	s := newStation(t, Config{}, &puppet{"tug", 1, func(_ context.Context, _ *model.Model, o backends.Options) (*model.Answer, error) {
		for k := range steps {
			o.Progress(backends.Progress{Iteration: k, Primal: 2, Dual: 1, Gap: 0.5, PrimalResidual: 0.1, DualResidual: 0.2, Step: 0.9, Elapsed: time.Second})
		}
		return right(), nil
	}})
	id := s.submit(smallest(), nil)
	began := time.Now()
	events, err := s.watch(id, 0)
	if err != nil {
		t.Fatal(err)
	}
	allowed := 1 + int(time.Since(began)/progressEvery)
	n := 0
	for _, e := range events {
		if p := e.GetProgress(); p != nil {
			n++
			if p.GetPrimal() != 2 || p.GetDual() != 1 || p.GetGap() != 0.5 || p.GetPrimalResidual() != 0.1 || p.GetDualResidual() != 0.2 || p.GetStep() != 0.9 || p.GetElapsed().AsDuration() != time.Second {
				t.Errorf("progress %v", p)
			}
		}
	}
	if n < 1 || n > allowed {
		t.Errorf("%d of %d steps were told, want 1 to %d", n, steps, allowed)
	}
}

// A reader who comes late finds every state and the latest progress, in order.
func TestSlowReadersLoseNoState(t *testing.T) {
	f := newFeed()
	now := time.Unix(1e9, 0)
	for k := range 100 {
		f.state(&towpathv1.Job{ModelName: string(rune('a' + k%26))}, now, false)
		now = now.Add(progressEvery)
		f.step(&towpathv1.Progress{Iteration: uint32(k)}, now)
		f.step(&towpathv1.Progress{Iteration: 1000}, now) // too soon
	}
	events, _, ended := f.after(0)
	if ended || len(events) != 101 {
		t.Fatalf("%d events, want 100 states and the latest progress", len(events))
	}
	if p := events[100].GetProgress(); p.GetIteration() != 99 {
		t.Errorf("the latest progress is %v", p)
	}
	if !slices.IsSortedFunc(events, func(a, b *towpathv1.WatchJobResponse) int { return int(a.GetSequence()) - int(b.GetSequence()) }) {
		t.Error("events are out of order")
	}
	f.state(&towpathv1.Job{}, now, true)
	f.state(&towpathv1.Job{}, now, false) // nothing follows the end
	f.step(&towpathv1.Progress{}, now.Add(time.Hour))
	if events, _, ended := f.after(200); !ended || len(events) != 1 {
		t.Errorf("after the end: %d events, ended %v", len(events), ended)
	}
}
