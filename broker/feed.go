package broker

import (
	"cmp"
	"slices"
	"sync"
	"time"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/types/known/timestamppb"
)

// feed is what happened to one job, for watch streams. State changes are all kept; of progress only the latest, so that
// a slow reader loses nothing that matters.
type feed struct {
	mu       sync.Mutex
	sequence uint64
	states   []*towpathv1.WatchJobResponse
	progress *towpathv1.WatchJobResponse
	told     time.Time // when progress was last published
	wake     chan struct{}
	ended    bool
}

func newFeed() *feed { return &feed{wake: make(chan struct{})} }

// progressEvery bounds how often progress is published.
const progressEvery = 200 * time.Millisecond

// state publishes a change of state.
func (f *feed) state(job *towpathv1.Job, now time.Time, ended bool) {
	f.mu.Lock()
	defer f.mu.Unlock()
	if f.ended {
		return
	}
	f.sequence++
	f.ended = ended
	f.states = append(f.states, &towpathv1.WatchJobResponse{Sequence: f.sequence, Time: timestamppb.New(now), Event: &towpathv1.WatchJobResponse_Job{Job: job}})
	f.rouse()
}

// step publishes progress, unless it comes too soon after the last.
func (f *feed) step(p *towpathv1.Progress, now time.Time) {
	f.mu.Lock()
	defer f.mu.Unlock()
	if f.ended || now.Sub(f.told) < progressEvery {
		return
	}
	f.told = now
	f.sequence++
	f.progress = &towpathv1.WatchJobResponse{Sequence: f.sequence, Time: timestamppb.New(now), Event: &towpathv1.WatchJobResponse_Progress{Progress: p}}
	f.rouse()
}

func (f *feed) rouse() {
	close(f.wake)
	f.wake = make(chan struct{})
}

// last returns the latest sequence number.
func (f *feed) last() uint64 {
	f.mu.Lock()
	defer f.mu.Unlock()
	return f.sequence
}

// after returns the events behind a sequence number in order, a channel that is closed when there are more, and whether
// these are the last.
func (f *feed) after(sequence uint64) (events []*towpathv1.WatchJobResponse, more <-chan struct{}, ended bool) {
	f.mu.Lock()
	defer f.mu.Unlock()
	all := f.states
	if f.progress != nil {
		all = append(slices.Clone(all), f.progress)
	}
	for _, e := range all {
		if e.GetSequence() > sequence {
			events = append(events, e)
		}
	}
	slices.SortFunc(events, func(a, b *towpathv1.WatchJobResponse) int { return cmp.Compare(a.GetSequence(), b.GetSequence()) })
	return events, f.wake, f.ended
}
