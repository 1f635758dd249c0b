package broker

import (
	"fmt"
	"time"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/types/known/timestamppb"
)

// WatchJob implements towpathv1.JobServiceServer.
func (s *jobService) WatchJob(q *towpathv1.WatchJobRequest, stream grpc.ServerStreamingServer[towpathv1.WatchJobResponse]) error {
	l := s.b.liveJob(q.GetJobId())
	if l == nil {
		_, _, err := s.b.get(stream.Context(), q.GetJobId())
		return err
	}
	sequence := q.GetAfterSequence()
	if last := l.feed.last(); sequence > last {
		return invalid("after_sequence", "the request", fmt.Sprintf("after_sequence is %d and the job's last event has %d", sequence, last), "use the sequence of an earlier event, or 0")
	}
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
			if events, _, done := l.feed.after(sequence); done || len(events) > 0 {
				continue // what has happened is told first
			}
			return refuse(codes.Unavailable, Draining, "the server is stopping; watch again after sequence %d", sequence)
		case <-stream.Context().Done():
			return stream.Context().Err()
		}
	}
}
