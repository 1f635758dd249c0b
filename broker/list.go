package broker

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"towpath/broker/store"
	towpathv1 "towpath/proto/towpath/v1"

	"github.com/google/uuid"
	"google.golang.org/protobuf/proto"
)

// Sizes of a page of jobs. A page ends early at pageBytes, so that it fits into a message of gRPC's usual limit.
const (
	usualPage   = 50
	longestPage = 1000
	pageBytes   = 2 << 20
)

// ListJobs implements towpathv1.JobServiceServer. A page token is the last id seen; ids fall with age.
func (s *jobService) ListJobs(ctx context.Context, q *towpathv1.ListJobsRequest) (*towpathv1.ListJobsResponse, error) {
	size := int(q.GetPageSize())
	switch {
	case size < 0:
		return nil, invalid("page_size", "the request", fmt.Sprintf("page_size is %d", size), "use 0 for the usual size, or up to 1000")
	case size == 0:
		size = usualPage
	}
	size = min(size, longestPage)
	if t := q.GetPageToken(); t != "" && uuid.Validate(t) != nil {
		return nil, invalid("page_token", "the request", "page_token is not one of ours", "use the token of an earlier response")
	}
	keys, err := s.b.records.Keys(ctx, jobKey(""))
	if err != nil {
		return nil, err
	}
	slices.Reverse(keys)
	out := &towpathv1.ListJobsResponse{}
	bytes := 0
	for _, k := range keys {
		if q.GetPageToken() != "" && k >= jobKey(q.GetPageToken()) {
			continue
		}
		raw, _, err := s.b.records.Get(ctx, k)
		if errors.Is(err, store.ErrMissing) {
			continue // forgotten meanwhile
		}
		if err != nil {
			return nil, err
		}
		r, err := decodeRecord(raw)
		if err != nil {
			return nil, err
		}
		if !matches(r.Job, q) {
			continue
		}
		bytes += proto.Size(r.Job)
		if n := len(out.Jobs); n == size || n > 0 && bytes > pageBytes {
			out.NextPageToken = out.Jobs[n-1].GetId()
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
