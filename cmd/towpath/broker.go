package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"time"

	"towpath/broker/wire"
	towpathv1 "towpath/proto/towpath/v1"

	"github.com/google/uuid"
	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/credentials/insecure"
	"google.golang.org/grpc/keepalive"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/durationpb"
)

// broker is a connection to one, in another process or in this one.
type broker struct {
	jobs   towpathv1.JobServiceClient
	routes towpathv1.RouteServiceClient
	close  func()
}

// callLimit bounds a single question and its answer; solving and transfers are not single questions.
const callLimit = 30 * time.Second

// politeKeepalive finds a dead connection within a minute. Servers refuse clients that ask much more often.
var politeKeepalive = keepalive.ClientParameters{Time: 30 * time.Second, Timeout: 20 * time.Second}

// retryPolicy repeats a call when the broker is briefly away, as while it is being replaced.
const retryPolicy = `{"methodConfig": [{"name": [{"service": "towpath.v1.JobService"}, {"service": "towpath.v1.RouteService"}],
 "retryPolicy": {"maxAttempts": 4, "initialBackoff": "0.1s", "maxBackoff": "5s", "backoffMultiplier": 2, "retryableStatusCodes": ["UNAVAILABLE"]}}]}`

// dial connects to a broker at an address. There is no encryption yet, on either side.
func dial(address string) (*broker, error) {
	conn, err := grpc.NewClient(address, grpc.WithTransportCredentials(insecure.NewCredentials()),
		grpc.WithKeepaliveParams(politeKeepalive), grpc.WithDefaultServiceConfig(retryPolicy))
	if err != nil {
		return nil, usageError("--address %s: %v; give host:port", address, err)
	}
	return newBroker(conn, func() { conn.Close() }), nil
}

func newBroker(conn grpc.ClientConnInterface, close func()) *broker {
	return &broker{jobs: towpathv1.NewJobServiceClient(conn), routes: towpathv1.NewRouteServiceClient(conn), close: close}
}

// inlineLimit is the size up to which a model travels inside its request: well under gRPC's limit of 4 MiB for one
// message, which also has to hold the options.
const inlineLimit = 3 << 20

// handOver gives a model to the broker: small ones are returned for the request, large ones are uploaded and named.
// The model may be changed.
func (b *broker) handOver(ctx context.Context, m *towpathv1.Model) (inline *towpathv1.Model, id string, err error) {
	if proto.Size(m) <= inlineLimit {
		return m, "", nil
	}
	if m, err = compact(m); err != nil {
		return nil, "", err
	}
	stream, err := b.jobs.UploadModel(ctx)
	if err != nil {
		return nil, "", fmt.Errorf("uploading the model: %w", err)
	}
	err = wire.SendModel(m, stream.Send)
	if err != nil && !errors.Is(err, io.EOF) { // at EOF the broker has ended the stream and says why below
		return nil, "", fmt.Errorf("uploading the model: %w", err)
	}
	response, err := stream.CloseAndRecv()
	if err != nil {
		return nil, "", fmt.Errorf("uploading the model: %w", err)
	}
	return nil, response.GetModelId(), nil
}

// compact writes a model with arrays, which can travel in chunks, in place of readable terms, which cannot.
func compact(m *towpathv1.Model) (*towpathv1.Model, error) {
	decoded, err := wire.ModelFromProto(m)
	if err != nil {
		return nil, err
	}
	return wire.ModelToProto(decoded), nil
}

// submit hands in a model and returns the accepted job.
func (b *broker) submit(ctx context.Context, m *towpathv1.Model, o *towpathv1.JobOptions) (*towpathv1.Job, error) {
	inline, id, err := b.handOver(ctx, m)
	if err != nil {
		return nil, err
	}
	// The name makes it safe to repeat the call when the reply is lost.
	r := &towpathv1.SubmitJobRequest{Options: o, RequestId: uuid.NewString()}
	if inline != nil {
		r.Source = &towpathv1.SubmitJobRequest_Model{Model: inline}
	} else {
		r.Source = &towpathv1.SubmitJobRequest_ModelId{ModelId: id}
	}
	ctx, cancel := context.WithTimeout(ctx, callLimit)
	defer cancel()
	response, err := b.jobs.SubmitJob(ctx, r)
	return response.GetJob(), err
}

// plan asks for the routes of a model.
func (b *broker) plan(ctx context.Context, m *towpathv1.Model, o *towpathv1.JobOptions) (*towpathv1.PlanRoutesResponse, error) {
	inline, id, err := b.handOver(ctx, m)
	if err != nil {
		return nil, err
	}
	r := &towpathv1.PlanRoutesRequest{Options: o}
	if inline != nil {
		r.Source = &towpathv1.PlanRoutesRequest_Model{Model: inline}
	} else {
		r.Source = &towpathv1.PlanRoutesRequest_ModelId{ModelId: id}
	}
	return b.routes.PlanRoutes(ctx, r)
}

// ended reports whether a job will not change any more.
func ended(s towpathv1.JobState) bool {
	switch s {
	case towpathv1.JobState_JOB_STATE_ANSWERED, towpathv1.JobState_JOB_STATE_FAILED,
		towpathv1.JobState_JOB_STATE_WITHDRAWN, towpathv1.JobState_JOB_STATE_EXPIRED:
		return true
	}
	return false
}

// await waits for a job's end without watching.
func (b *broker) await(ctx context.Context, job *towpathv1.Job) (*towpathv1.Job, error) {
	const patience = 20 * time.Second // per call; the broker may answer sooner
	for !ended(job.GetState()) {
		response, err := b.jobs.GetJob(ctx, &towpathv1.GetJobRequest{JobId: job.GetId(), Wait: durationpb.New(patience)})
		if err != nil {
			return nil, err
		}
		job = response.GetJob()
	}
	return job, nil
}

// watch calls event for everything that happens to a job until it ends. A stream that breaks off, as when the broker is
// replaced, is taken up again after the last event seen.
func (b *broker) watch(ctx context.Context, id string, event func(*towpathv1.WatchJobResponse)) (*towpathv1.Job, error) {
	const attempts = 5
	var last *towpathv1.Job
	seen := uint64(0)
	for broken := 0; ; {
		stream, err := b.jobs.WatchJob(ctx, &towpathv1.WatchJobRequest{JobId: id, AfterSequence: seen})
		for err == nil {
			var e *towpathv1.WatchJobResponse
			if e, err = stream.Recv(); err != nil {
				break
			}
			broken = 0
			seen = max(seen, e.GetSequence())
			if e.GetJob() != nil {
				last = e.GetJob()
			}
			event(e)
		}
		if errors.Is(err, io.EOF) && ended(last.GetState()) {
			return last, nil
		}
		broken++
		gone := !errors.Is(err, io.EOF) && reply(err).Code() != codes.Unavailable
		if gone || broken == attempts {
			return nil, fmt.Errorf("watching job %s: %w", id, err)
		}
		select {
		case <-ctx.Done():
			return nil, ctx.Err()
		case <-time.After(time.Duration(broken) * 200 * time.Millisecond):
		}
	}
}

// fetch returns the answer of an answered job.
func (b *broker) fetch(ctx context.Context, id string) (*towpathv1.Answer, error) {
	stream, err := b.jobs.FetchAnswer(ctx, &towpathv1.FetchAnswerRequest{JobId: id})
	if err != nil {
		return nil, err
	}
	return wire.ReceiveAnswer(stream.Recv)
}

// withdraw stops a job on behalf of somebody who has already left: it does not use their context.
func (b *broker) withdraw(id string) {
	ctx, cancel := context.WithTimeout(context.Background(), 5*time.Second)
	defer cancel()
	b.jobs.WithdrawJob(ctx, &towpathv1.WithdrawJobRequest{JobId: id})
}
