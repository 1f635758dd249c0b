package broker

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"time"
	"unicode/utf8"

	"towpath/broker/store"
	"towpath/broker/wire"
	"towpath/capability"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"github.com/google/uuid"
	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/durationpb"
	"google.golang.org/protobuf/types/known/timestamppb"
)

// jobService serves towpath.v1.JobService.
type jobService struct {
	towpathv1.UnimplementedJobServiceServer
	b *Broker
}

const (
	maxLabels  = 32
	maxLabel   = 256 // bytes of a key or a value
	maxRequest = 128 // bytes of a request_id
	longestGet = 60 * time.Second
)

func invalid(path, place, problem, cure string) error {
	f := model.Fault{Path: path, Place: place, Problem: problem, Cure: cure}
	return &refusal{code: codes.InvalidArgument, reason: RequestInvalid, text: f.String(), faults: []model.Fault{f}}
}

// validOptions checks what a job asks for.
func validOptions(o *towpathv1.JobOptions) error {
	if t := o.GetTolerance(); math.IsNaN(t) || t < 0 || t >= 1 {
		return invalid("options.tolerance", "the options", fmt.Sprintf("the tolerance is %g", t), "use a number from 0 (the default) to less than 1")
	}
	for _, x := range []struct {
		name string
		d    *durationpb.Duration
	}{{"run_limit", o.GetRunLimit()}, {"life_limit", o.GetLifeLimit()}} {
		if x.d != nil && (x.d.CheckValid() != nil || x.d.AsDuration() <= 0) {
			return invalid("options."+x.name, "the options", fmt.Sprintf("%s is not a positive duration", x.name), "give seconds, or leave it out for the server's limit")
		}
	}
	if o.GetMaxMemoryBytes() > math.MaxInt64 {
		return invalid("options.max_memory_bytes", "the options", "max_memory_bytes is larger than any machine", "leave it 0 for the server's limit")
	}
	if o.GetMaxIterations() > math.MaxInt32 {
		return invalid("options.max_iterations", "the options", "max_iterations is too large", "leave it 0 for the back end's default")
	}
	return nil
}

func validLabels(labels map[string]string) error {
	if len(labels) > maxLabels {
		return invalid("labels", "the labels", fmt.Sprintf("there are %d", len(labels)), fmt.Sprintf("use at most %d", maxLabels))
	}
	for k, v := range labels {
		if k == "" || len(k) > maxLabel || len(v) > maxLabel || !utf8.ValidString(k) || !utf8.ValidString(v) {
			return invalid("labels", "the labels", "one is empty or too long", fmt.Sprintf("use keys of 1 to %d bytes and values of at most %d", maxLabel, maxLabel))
		}
	}
	return nil
}

// SubmitJob implements towpathv1.JobServiceServer.
func (s *jobService) SubmitJob(ctx context.Context, q *towpathv1.SubmitJobRequest) (*towpathv1.SubmitJobResponse, error) {
	if err := validOptions(q.GetOptions()); err != nil {
		return nil, statusOf(err)
	}
	if err := validLabels(q.GetLabels()); err != nil {
		return nil, statusOf(err)
	}
	if n := len(q.GetRequestId()); n > maxRequest {
		return nil, statusOf(invalid("request_id", "the request", fmt.Sprintf("request_id has %d bytes", n), fmt.Sprintf("use at most %d", maxRequest)))
	}
	job, err := s.submit(ctx, q)
	if err != nil {
		return nil, statusOf(err)
	}
	return &towpathv1.SubmitJobResponse{Job: job}, nil
}

func (s *jobService) submit(ctx context.Context, q *towpathv1.SubmitJobRequest) (job *towpathv1.Job, err error) {
	b := s.b
	unique, err := uuid.NewV7()
	if err != nil {
		return nil, err
	}
	id := unique.String()
	if q.GetRequestId() != "" {
		earlier, err := b.claimRequest(ctx, q, id)
		if err != nil || earlier != nil {
			return earlier, err
		}
		defer func() {
			if err != nil {
				b.releaseRequest(q.GetRequestId())
			}
		}()
	}
	m, modelID, err := b.modelOf(ctx, q.GetModel(), q.GetModelId(), q.GetSource() != nil)
	if err != nil {
		return nil, err
	}
	proposals, err := b.planner.plan(capability.Summarize(m), q.GetOptions(), b.cfg.MemoryLimit)
	if err != nil {
		return nil, err
	}
	if proposals[0].Route == nil {
		return nil, noRoute(proposals)
	}
	if q.GetModel() != nil {
		modelID, _, err = b.keepModel(ctx, q.GetModel(), m, true)
	} else {
		err = b.claimModel(modelID)
	}
	if err != nil {
		return nil, err
	}
	life := b.cfg.LifeLimit
	if d := q.GetOptions().GetLifeLimit(); d != nil {
		life = min(life, d.AsDuration())
	}
	job = &towpathv1.Job{
		Id: id, State: towpathv1.JobState_JOB_STATE_WAITING, ModelName: m.Name, Labels: q.GetLabels(), SubmitTime: timestamppb.Now(),
		WaitingReason: "no worker was free yet", Options: q.GetOptions(),
	}
	if err := b.accept(ctx, job, modelID, q.GetRequestId(), life); err != nil {
		b.releaseModel(modelID)
		return nil, err
	}
	return job, nil
}

// modelOf finds the model of a request, validated.
func (b *Broker) modelOf(ctx context.Context, p *towpathv1.Model, id string, given bool) (*model.Model, string, error) {
	if !given {
		return nil, "", invalid("source", "the request", "it has no model", "give model, or the model_id of an uploaded one")
	}
	if p != nil {
		m, err := admit(p)
		return m, "", err
	}
	m, err := b.loadModel(ctx, id)
	return m, id, err
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
	old, _, err := b.records.Get(ctx, requestKey(q.GetRequestId()))
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
		x := refuse(codes.Unavailable, RequestIDReused, "the same request is being accepted at this moment; try again")
		x.retry = time.Second
		return nil, x
	}
	return r.Job, nil
}

func (b *Broker) releaseRequest(id string) {
	ctx := context.Background()
	if _, revision, err := b.records.Get(ctx, requestKey(id)); err == nil {
		_ = b.records.Delete(ctx, requestKey(id), revision) // somebody else's change is theirs to settle
	}
}

// UploadModel implements towpathv1.JobServiceServer.
func (s *jobService) UploadModel(stream grpc.ClientStreamingServer[towpathv1.UploadModelRequest, towpathv1.UploadModelResponse]) error {
	head, err := s.receive(stream)
	if err != nil {
		return statusOf(err)
	}
	m, err := admit(head)
	if err != nil {
		return statusOf(err)
	}
	id, until, err := s.b.keepModel(stream.Context(), head, m, false)
	if err != nil {
		return statusOf(err)
	}
	return stream.SendAndClose(&towpathv1.UploadModelResponse{ModelId: id, ExpireTime: timestamppb.New(until)})
}

func (s *jobService) receive(stream grpc.ClientStreamingServer[towpathv1.UploadModelRequest, towpathv1.UploadModelResponse]) (*towpathv1.Model, error) {
	broken := func(text string) error { return refuse(codes.InvalidArgument, UploadBroken, "%s", text) }
	first, err := stream.Recv()
	if errors.Is(err, io.EOF) {
		return nil, broken("the stream is empty; send the head of the model first")
	}
	if err != nil {
		return nil, err
	}
	head := first.GetHead()
	if head == nil {
		return nil, broken("the stream does not begin with the head of the model; send it first")
	}
	c, err := wire.NewCollector(head, s.b.cfg.UploadLimit)
	if err != nil {
		return nil, err
	}
	for {
		next, err := stream.Recv()
		if errors.Is(err, io.EOF) {
			return head, c.Finish()
		}
		if err != nil {
			return nil, err
		}
		if next.GetChunk() == nil {
			return nil, broken("the stream has a second head or an empty message; send chunks after the head")
		}
		if err := c.Add(next.GetChunk()); err != nil {
			return nil, err
		}
	}
}

// GetJob implements towpathv1.JobServiceServer.
func (s *jobService) GetJob(ctx context.Context, q *towpathv1.GetJobRequest) (*towpathv1.GetJobResponse, error) {
	r, _, err := s.b.get(ctx, q.GetJobId())
	if err != nil {
		return nil, statusOf(err)
	}
	if wait := min(q.GetWait().AsDuration(), longestGet); wait > 0 && !ended(r.Job.GetState()) {
		s.b.mu.Lock()
		l := s.b.live[q.GetJobId()]
		s.b.mu.Unlock()
		if l != nil {
			timer := time.NewTimer(wait)
			defer timer.Stop()
			select {
			case <-l.done:
			case <-timer.C:
			case <-s.b.drained:
			case <-ctx.Done():
				return nil, statusOf(ctx.Err())
			}
		}
		if r, _, err = s.b.get(ctx, q.GetJobId()); err != nil {
			return nil, statusOf(err)
		}
	}
	return &towpathv1.GetJobResponse{Job: s.b.explained(r.Job)}, nil
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
		return statusOf(err)
	}
	if r.Answer == "" {
		why := "wait for it to end"
		if ended(r.Job.GetState()) {
			why = r.Job.GetFault().GetMessage()
		}
		return statusOf(refuse(codes.FailedPrecondition, NoAnswer, "job '%s' is %s and has no answer: %s", q.GetJobId(), word(r.Job.GetState()), why))
	}
	raw, err := s.b.blobs.Get(ctx, r.Answer)
	if err != nil {
		return statusOf(err)
	}
	a := &towpathv1.Answer{}
	if err := proto.Unmarshal(raw, a); err != nil {
		return statusOf(err)
	}
	parcels := wire.Unload(a)
	if err := stream.Send(&towpathv1.FetchAnswerResponse{Part: &towpathv1.FetchAnswerResponse_Head{Head: a}}); err != nil {
		return err
	}
	for _, p := range parcels {
		err := p.Send(func(c *towpathv1.Chunk) error {
			return stream.Send(&towpathv1.FetchAnswerResponse{Part: &towpathv1.FetchAnswerResponse_Chunk{Chunk: c}})
		})
		if err != nil {
			return err
		}
	}
	return nil
}

// WatchJob implements towpathv1.JobServiceServer.
func (s *jobService) WatchJob(q *towpathv1.WatchJobRequest, stream grpc.ServerStreamingServer[towpathv1.WatchJobResponse]) error {
	s.b.mu.Lock()
	l := s.b.live[q.GetJobId()]
	s.b.mu.Unlock()
	if l == nil {
		_, _, err := s.b.get(stream.Context(), q.GetJobId())
		return statusOf(err)
	}
	sequence := q.GetAfterSequence()
	idle := time.NewTimer(s.b.cfg.Idle)
	defer idle.Stop()
	for {
		events, more, done := l.feed.after(sequence)
		for _, e := range events {
			if err := stream.Send(e); err != nil {
				return err
			}
			sequence = e.GetSequence()
		}
		if done {
			return nil
		}
		if len(events) > 0 {
			continue
		}
		idle.Reset(s.b.cfg.Idle)
		select {
		case <-more:
		case <-idle.C:
			e := &towpathv1.WatchJobResponse{Sequence: sequence, Time: timestamppb.Now(), Event: &towpathv1.WatchJobResponse_Idle{Idle: &towpathv1.Idle{}}}
			if err := stream.Send(e); err != nil {
				return err
			}
		case <-s.b.drained:
			if _, _, done := l.feed.after(sequence); done {
				continue // the last event is still to be sent
			}
			return statusOf(refuse(codes.Unavailable, Draining, "the server is stopping; watch again after sequence %d", sequence))
		case <-stream.Context().Done():
			return statusOf(stream.Context().Err())
		}
	}
}

// WithdrawJob implements towpathv1.JobServiceServer.
func (s *jobService) WithdrawJob(ctx context.Context, q *towpathv1.WithdrawJobRequest) (*towpathv1.WithdrawJobResponse, error) {
	r, err := s.b.settle(q.GetJobId(), towpathv1.JobState_JOB_STATE_WITHDRAWN, Withdrawn, "withdrawn by the client")
	if err != nil && !errors.Is(err, errEnded) {
		return nil, statusOf(err)
	}
	return &towpathv1.WithdrawJobResponse{Job: r.Job}, nil
}

// ListJobs implements towpathv1.JobServiceServer. A page token is the last id seen; ids fall with age.
func (s *jobService) ListJobs(ctx context.Context, q *towpathv1.ListJobsRequest) (*towpathv1.ListJobsResponse, error) {
	const usual, most = 50, 1000
	size := int(q.GetPageSize())
	switch {
	case size < 0:
		return nil, statusOf(invalid("page_size", "the request", fmt.Sprintf("page_size is %d", size), "use 0 for the usual size, or up to 1000"))
	case size == 0:
		size = usual
	}
	size = min(size, most)
	if t := q.GetPageToken(); t != "" && uuid.Validate(t) != nil {
		return nil, statusOf(invalid("page_token", "the request", "page_token is not one of ours", "use the token of an earlier response"))
	}
	keys, err := s.b.records.Keys(ctx, jobKey(""))
	if err != nil {
		return nil, statusOf(err)
	}
	slices.Reverse(keys)
	out := &towpathv1.ListJobsResponse{}
	for _, k := range keys {
		if q.GetPageToken() != "" && k >= jobKey(q.GetPageToken()) {
			continue
		}
		raw, _, err := s.b.records.Get(ctx, k)
		if errors.Is(err, store.ErrMissing) {
			continue // forgotten meanwhile
		}
		if err != nil {
			return nil, statusOf(err)
		}
		r, err := decodeRecord(raw)
		if err != nil {
			return nil, statusOf(err)
		}
		if !matches(r.Job, q) {
			continue
		}
		if len(out.Jobs) == size {
			out.NextPageToken = out.Jobs[size-1].GetId()
			break
		}
		out.Jobs = append(out.Jobs, s.b.explained(r.Job))
	}
	return out, nil
}

func matches(job *towpathv1.Job, q *towpathv1.ListJobsRequest) bool {
	if len(q.GetStates()) > 0 && !slices.Contains(q.GetStates(), job.GetState()) {
		return false
	}
	for k, v := range q.GetLabels() {
		if have, ok := job.GetLabels()[k]; !ok || have != v {
			return false
		}
	}
	return true
}
