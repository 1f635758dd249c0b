package broker

import (
	"sync/atomic"
	"time"

	"towpath/broker/wire"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/types/known/timestamppb"
)

type uploadStream = grpc.ClientStreamingServer[towpathv1.UploadModelRequest, towpathv1.UploadModelResponse]

// UploadModel implements towpathv1.JobServiceServer.
func (s *jobService) UploadModel(stream uploadStream) error {
	in, err := s.b.receive(stream)
	if err != nil {
		return err
	}
	until := time.Now().Add(s.b.cfg.ModelLifetime)
	err = s.b.keepModel(stream.Context(), in, func(use *modelUse) {
		if use.until.Before(until) {
			use.until = until
		}
	})
	if err != nil {
		return err
	}
	return stream.SendAndClose(&towpathv1.UploadModelResponse{ModelId: in.id, ExpireTime: timestamppb.New(until)})
}

// receive takes a model from its stream. Reading goes on in a goroutine of its own, because a read cannot be called off:
// a client that stops sending, and a server that stops, end the call, which ends the read.
func (b *Broker) receive(stream uploadStream) (*intake, error) {
	var messages atomic.Int64
	var complete atomic.Bool
	var reserved int64 // the reader's, until it is done
	type result struct {
		in  *intake
		err error
	}
	done := make(chan result, 1)
	go func() {
		defer func() { b.unreserve(reserved) }()
		defer func() {
			if x := recover(); x != nil {
				done <- result{nil, b.panicked("UploadModel", x)}
			}
		}()
		p, err := wire.ReceiveModel(func() (*towpathv1.UploadModelRequest, error) {
			q, err := stream.Recv()
			messages.Add(1)
			return q, err
		}, b.cfg.UploadLimit, func(bytes uint64) error {
			err := b.reserve(int64(bytes))
			if err == nil {
				reserved += int64(bytes)
			}
			return err
		})
		complete.Store(true)
		if err != nil {
			done <- result{nil, err}
			return
		}
		in, err := admit(p)
		done <- result{in, err}
	}()
	tick := time.NewTicker(b.cfg.UploadPause)
	defer tick.Stop()
	for seen := int64(-1); ; {
		select {
		case r := <-done:
			return r.in, r.err
		case <-b.drained:
			return nil, refuse(codes.Unavailable, Draining, "the server is stopping; upload again")
		case <-tick.C:
			now := messages.Load()
			if now == seen && !complete.Load() {
				return nil, refuse(codes.DeadlineExceeded, UploadBroken, "nothing came for %v; upload again, without pauses", b.cfg.UploadPause)
			}
			seen = now
		}
	}
}

// reserve takes memory for an upload in progress. All uploads together have as much as the store.
func (b *Broker) reserve(bytes int64) error {
	b.mu.Lock()
	defer b.mu.Unlock()
	if bytes > b.cfg.StoreLimit-b.uploading {
		x := refuse(codes.ResourceExhausted, StoreFull, "there is no room for %d more bytes of uploads; try later", bytes)
		x.retry = 30 * time.Second
		return x
	}
	b.uploading += bytes
	return nil
}

func (b *Broker) unreserve(bytes int64) {
	b.mu.Lock()
	defer b.mu.Unlock()
	b.uploading -= bytes
}
