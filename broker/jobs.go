package broker

import (
	"context"
	"errors"
	"time"

	"towpath/broker/store"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/timestamppb"
)

// errEnded says that a job has ended and does not change any more.
var errEnded = errors.New("the job has ended")

// get reads a job's record.
func (b *Broker) get(ctx context.Context, id string) (*record, uint64, error) {
	raw, revision, err := b.records.Get(ctx, jobKey(id))
	if errors.Is(err, store.ErrMissing) {
		return nil, 0, refuse(codes.NotFound, UnknownJob, "there is no job '%s'; ended jobs are kept for a while only", id)
	}
	if err != nil {
		return nil, 0, err
	}
	r, err := decodeRecord(raw)
	return r, revision, err
}

// change applies a change to a job that has not ended, by compare-and-set, and publishes it: errEnded when it has.
func (b *Broker) change(id string, apply func(*record)) (*record, error) {
	ctx := context.Background() // what has been decided is stored, whoever is still listening
	for {
		r, revision, err := b.get(ctx, id)
		if err != nil {
			return nil, err
		}
		if ended(r.Job.GetState()) {
			return r, errEnded
		}
		apply(r)
		now := time.Now()
		final := ended(r.Job.GetState())
		if final {
			r.Job.EndTime = timestamppb.New(now)
			r.Job.WaitingReason = ""
		}
		raw, err := r.encode()
		if err != nil {
			return nil, err
		}
		_, err = b.records.Swap(ctx, jobKey(id), raw, revision)
		if errors.Is(err, store.ErrChanged) {
			continue
		}
		if err != nil {
			return nil, err
		}
		b.log.Info("job changed", zap.String("job", id), zap.String("state", word(r.Job.GetState())), zap.String("fault", r.Job.GetFault().GetMessage()))
		b.mu.Lock()
		if l := b.live[id]; l != nil {
			l.feed.state(proto.CloneOf(r.Job), now, final)
			if final {
				b.finish(id, l)
			}
		}
		b.mu.Unlock()
		return r, nil
	}
}

// finish settles what a job held and forgets the oldest ended jobs beyond those kept; b.mu is held.
func (b *Broker) finish(id string, l *liveJob) {
	l.expiry.Stop()
	close(l.done)
	b.release(l.model)
	b.ended = append(b.ended, id)
	for len(b.ended) > b.cfg.Retain {
		b.forgetOldest()
	}
}

// forgetOldest removes the job that ended first, with its answer; b.mu is held.
func (b *Broker) forgetOldest() {
	ctx := context.Background()
	old := b.ended[0]
	b.ended = b.ended[1:]
	keys := []string{jobKey(old)}
	if request := b.live[old].request; request != "" {
		keys = append(keys, requestKey(request))
	}
	delete(b.live, old)
	for _, k := range keys {
		if _, revision, err := b.records.Get(ctx, k); err == nil {
			if err := b.records.Delete(ctx, k, revision); err != nil {
				b.log.Error("forgetting a job", zap.String("job", old), zap.Error(err))
			}
		}
	}
	if err := b.blobs.Delete(ctx, answerKey(old)); err != nil {
		b.log.Error("forgetting an answer", zap.String("job", old), zap.Error(err))
	}
}

// settle ends a job with a state and a fault, and stops its solve if one runs.
func (b *Broker) settle(id string, state towpathv1.JobState, reason Reason, text string) (*record, error) {
	r, err := b.change(id, func(r *record) {
		r.Job.State = state
		r.Job.Fault = &towpathv1.Fault{Reason: string(reason), Message: clip(text)}
	})
	if err != nil {
		return r, err
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	for k, waiting := range b.queue {
		if waiting == id {
			b.queue = append(b.queue[:k], b.queue[k+1:]...)
			break
		}
	}
	if l := b.live[id]; l != nil && l.cancel != nil {
		l.cancel(errEnded)
	}
	return r, nil
}

func (b *Broker) fail(id string, reason Reason, text string) {
	if _, err := b.settle(id, towpathv1.JobState_JOB_STATE_FAILED, reason, text); err != nil && !errors.Is(err, errEnded) {
		b.log.Error("failing a job", zap.String("job", id), zap.Error(err))
	}
}

func (b *Broker) expire(id string) {
	_, err := b.settle(id, towpathv1.JobState_JOB_STATE_EXPIRED, LifeLimitReached, "the job's life limit passed before there was an answer; ask for more time, or for less accuracy")
	if err != nil && !errors.Is(err, errEnded) {
		b.log.Error("expiring a job", zap.String("job", id), zap.Error(err))
	}
}

// word gives a state's name in logs.
func word(s towpathv1.JobState) string {
	switch s {
	case towpathv1.JobState_JOB_STATE_WAITING:
		return "waiting"
	case towpathv1.JobState_JOB_STATE_ROUTED:
		return "routed"
	case towpathv1.JobState_JOB_STATE_RUNNING:
		return "running"
	case towpathv1.JobState_JOB_STATE_ANSWERED:
		return "answered"
	case towpathv1.JobState_JOB_STATE_FAILED:
		return "failed"
	case towpathv1.JobState_JOB_STATE_WITHDRAWN:
		return "withdrawn"
	case towpathv1.JobState_JOB_STATE_EXPIRED:
		return "expired"
	}
	return "unknown"
}
