package broker

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"time"

	"towpath/broker/store"
	"towpath/capability"
	towpathv1 "towpath/proto/towpath/v1"

	"github.com/google/uuid"
	"go.uber.org/zap"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/timestamppb"
)

// submit makes a job of a request, or finds the one that the same request made before.
func (b *Broker) submit(ctx context.Context, q *towpathv1.SubmitJobRequest) (job *towpathv1.Job, err error) {
	unique, err := uuid.NewV7()
	if err != nil {
		return nil, err
	}
	id := unique.String()
	if q.GetRequestId() != "" {
		if job, err = b.claimRequest(ctx, q, id); err != nil || job != nil {
			return job, err
		}
		defer func() {
			if err != nil {
				b.releaseRequest(q.GetRequestId())
			}
		}()
	}
	if err := b.room(); err != nil { // before any work; accept looks again
		return nil, err
	}
	in, err := b.intake(ctx, q.GetModel(), q.GetModelId(), q.GetSource() != nil)
	if err != nil {
		return nil, err
	}
	proposals, err := b.planner.plan(in.demands, q.GetOptions(), b.cfg.MemoryLimit)
	if err != nil {
		return nil, err
	}
	if proposals[0].Route == nil {
		return nil, noRoute(proposals)
	}
	return b.enter(ctx, in, q, id)
}

// enter stores a model that has a route and makes a waiting job of it.
func (b *Broker) enter(ctx context.Context, in *intake, q *towpathv1.SubmitJobRequest, id string) (*towpathv1.Job, error) {
	if err := b.keepModel(ctx, in, func(use *modelUse) { use.jobs++ }); err != nil {
		return nil, err
	}
	life := b.cfg.LifeLimit
	if d := q.GetOptions().GetLifeLimit(); d != nil {
		life = min(life, d.AsDuration())
	}
	job := &towpathv1.Job{
		Id: id, State: towpathv1.JobState_JOB_STATE_WAITING, ModelName: in.name, Labels: q.GetLabels(), SubmitTime: timestamppb.Now(),
		WaitingReason: "no worker was free yet", Options: q.GetOptions(),
	}
	if err := b.accept(ctx, job, in.id, q.GetRequestId(), life); err != nil {
		b.mu.Lock()
		defer b.mu.Unlock()
		b.release(in.id)
		return nil, err
	}
	return job, nil
}

// room refuses jobs while the broker drains or the queue is full.
func (b *Broker) room() error {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.roomLocked()
}

// roomLocked is room with b.mu held.
func (b *Broker) roomLocked() error {
	switch {
	case b.drains:
		x := refuse(codes.Unavailable, Draining, "the server is stopping; try again")
		x.retry = time.Second
		return x
	case len(b.queue) >= b.cfg.QueueLimit:
		x := refuse(codes.ResourceExhausted, QueueFull, "%d jobs wait, which is the limit; try later", len(b.queue))
		x.retry = 5 * time.Second
		return x
	}
	return nil
}

// accept makes a job of a model in the store and puts it into the queue. The model's use was counted by the caller.
func (b *Broker) accept(ctx context.Context, job *towpathv1.Job, modelID, requestID string, life time.Duration) error {
	r := &record{Job: job, Model: modelID}
	raw, err := r.encode()
	if err != nil {
		return err
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	if err := b.roomLocked(); err != nil {
		return err
	}
	if _, err := b.records.Create(ctx, jobKey(job.GetId()), raw); err != nil {
		return err
	}
	id := job.GetId()
	l := &liveJob{feed: newFeed(), request: requestID, model: modelID, done: make(chan struct{})}
	l.expiry = time.AfterFunc(life, func() { b.expire(id) })
	l.feed.state(proto.CloneOf(job), time.Now(), false)
	b.live[id] = l
	b.queue = append(b.queue, id)
	b.work.Signal()
	b.log.Info("job changed", zap.String("job", id), zap.String("state", word(job.GetState())), zap.String("model", modelID), zap.String("name", job.GetModelName()))
	return nil
}

func noRoute(proposals []capability.Proposal) error {
	text := "no back end here can take this model:"
	for _, p := range proposals {
		for _, reason := range p.Unreachable.Reasons {
			text += "\n" + reason
		}
	}
	return refuse(codes.FailedPrecondition, NoRoute, "%s", text)
}

// request remembers which job a request_id made.
type request struct {
	Hash string `json:"hash"`
	Job  string `json:"job"`
}

// claimRequest takes a request_id for a new job, or returns the job that it made before.
func (b *Broker) claimRequest(ctx context.Context, q *towpathv1.SubmitJobRequest, id string) (*towpathv1.Job, error) {
	raw, err := proto.MarshalOptions{Deterministic: true}.Marshal(q)
	if err != nil {
		return nil, err
	}
	sum := sha256.Sum256(raw)
	mine := request{hex.EncodeToString(sum[:]), id}
	value, err := json.Marshal(mine)
	if err != nil {
		return nil, err
	}
	_, err = b.records.Create(ctx, requestKey(q.GetRequestId()), value)
	if !errors.Is(err, store.ErrExists) {
		return nil, err
	}
	again := refuse(codes.Unavailable, RequestIDReused, "the same request is being accepted at this moment; try again")
	again.retry = time.Second
	old, _, err := b.records.Get(ctx, requestKey(q.GetRequestId()))
	if errors.Is(err, store.ErrMissing) {
		return nil, again // given back meanwhile
	}
	if err != nil {
		return nil, err
	}
	var first request
	if err := json.Unmarshal(old, &first); err != nil {
		return nil, err
	}
	if first.Hash != mine.Hash {
		return nil, refuse(codes.AlreadyExists, RequestIDReused, "request_id '%s' was used for another request; use a new one for every job", q.GetRequestId())
	}
	r, _, err := b.get(ctx, first.Job)
	if err != nil {
		return nil, again
	}
	return r.Job, nil
}

func (b *Broker) releaseRequest(id string) {
	ctx := context.Background()
	if _, revision, err := b.records.Get(ctx, requestKey(id)); err == nil {
		_ = b.records.Delete(ctx, requestKey(id), revision) // somebody else's change is theirs to settle
	}
}
