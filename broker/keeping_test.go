package broker

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"towpath/broker/wire"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/genproto/googleapis/rpc/errdetails"
	spb "google.golang.org/genproto/googleapis/rpc/status"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
)

func statusAsProto(t *testing.T, err error) *spb.Status {
	t.Helper()
	st, ok := status.FromError(statusOf(err))
	if !ok {
		t.Fatalf("%v is no status", statusOf(err))
	}
	for _, v := range detail[*errdetails.BadRequest](st).GetFieldViolations()[min(shownFaults, len(detail[*errdetails.BadRequest](st).GetFieldViolations())):] {
		t.Errorf("one violation too many: %v", v)
	}
	return st.Proto()
}

// The same request with the same id is one job; another request with it is refused.
func TestRequestIDs(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Workers: 1, QueueLimit: 1}, &puppet{"tug", 1, h.solve})
	request := func(id, name string) (*towpathv1.Job, error) {
		m := smallest()
		m.Name = name
		r, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: m}, RequestId: id, Labels: map[string]string{"a": "1", "b": "2"}})
		return r.GetJob(), err
	}
	first, err := request("one", "m")
	if err != nil {
		t.Fatal(err)
	}
	s.signal(h.began, "the solve")
	again, err := request("one", "m")
	if err != nil || again.GetId() != first.GetId() {
		t.Errorf("again: %v (%v)", again, err)
	}
	_, err = request("one", "other")
	refused(t, err, codes.AlreadyExists, RequestIDReused, "request_id 'one' was used for another request; use a new one for every job")
	second, err := request("two", "m")
	if err != nil || second.GetId() == first.GetId() {
		t.Errorf("another id: %v (%v)", second, err)
	}
	_, err = request("three", "m")
	refused(t, err, codes.ResourceExhausted, QueueFull, "1 jobs wait")
	again, err = request("one", "m") // known jobs are told also when there is no room for new ones
	if err != nil || again.GetId() != first.GetId() {
		t.Errorf("again with a full queue: %v (%v)", again, err)
	}
	close(h.finish)
	s.wait(first.GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
	s.wait(second.GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
	again, err = request("one", "m")
	if err != nil || again.GetId() != first.GetId() || again.GetState() != towpathv1.JobState_JOB_STATE_ANSWERED {
		t.Errorf("after the end: %v (%v)", again, err)
	}
	third, err := request("three", "m") // the refusal has given the id back
	if err != nil {
		t.Fatal(err)
	}
	s.wait(third.GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
}

// Ended jobs are kept up to a number, the oldest go first, with record, answer and request_id.
func TestOldJobsAreForgotten(t *testing.T) {
	s := newStation(t, Config{Retain: 2, ModelLifetime: time.Nanosecond}, &puppet{"tug", 1, honestly})
	var ids []string
	for k := range 5 {
		m := smallest()
		m.Name = fmt.Sprint(k)
		r, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: m}, RequestId: fmt.Sprint(k)})
		if err != nil {
			t.Fatal(err)
		}
		ids = append(ids, r.GetJob().GetId())
		s.wait(ids[k], towpathv1.JobState_JOB_STATE_ANSWERED)
	}
	s.eventually("the state with two jobs and two requests", func() bool {
		keys, err := s.b.records.Keys(t.Context(), "")
		return err == nil && len(keys) == 4
	})
	for k, id := range ids {
		_, err := s.fetch(id)
		if (err == nil) != (k >= 3) {
			t.Errorf("job %d: %v", k, err)
		}
	}
	s.b.mu.Lock()
	defer s.b.mu.Unlock()
	if len(s.b.live) != 2 || len(s.b.models) != 0 {
		t.Errorf("%d jobs and %d models are remembered", len(s.b.live), len(s.b.models))
	}
}

// A job that is refused at the last moment, after its model was stored, leaves nothing behind.
func TestRefusedAtTheLastMoment(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	in, err := admit(smallest())
	if err != nil {
		t.Fatal(err)
	}
	s.b.mu.Lock() // what submit does first is over; from here on there is no room
	s.b.drains = true
	s.b.mu.Unlock()
	_, err = s.b.enter(t.Context(), in, &towpathv1.SubmitJobRequest{}, "id")
	refused(t, statusOf(err), codes.Unavailable, Draining, "the server is stopping; try again")
	s.b.mu.Lock()
	defer s.b.mu.Unlock()
	if len(s.b.models) != 0 || len(s.b.live) != 0 {
		t.Errorf("%d models and %d jobs are left", len(s.b.models), len(s.b.live))
	}
}

// When the store is full the oldest answers make room; what is in use does not.
func TestFullStoreMakesRoom(t *testing.T) {
	h := newHanging()
	close(h.finish)
	s := newStation(t, Config{StoreLimit: 10 << 10, ModelLifetime: time.Nanosecond}, &puppet{"tug", 1, h.solve})
	var ids []string
	for k := range 20 {
		m := smallest()
		m.Name = fmt.Sprint(k)
		ids = append(ids, s.submit(m, nil))
		s.wait(ids[k], towpathv1.JobState_JOB_STATE_ANSWERED)
	}
	kept := 0
	for _, id := range ids {
		if _, err := s.fetch(id); err == nil {
			kept++
		}
	}
	if kept == 0 || kept == len(ids) {
		t.Errorf("%d of %d answers are kept", kept, len(ids))
	}
	if _, err := s.fetch(ids[len(ids)-1]); err != nil {
		t.Errorf("the last answer is gone: %v", err)
	}
	big := smallest()
	big.Constraints[0].Rows = 1500
	big.Constraints[0].Constant = &towpathv1.Numbers{F64: &towpathv1.Array{Place: &towpathv1.Array_Data{Data: make([]byte, 12_000)}}}
	_, err := s.try(big, nil)
	st := refused(t, err, codes.ResourceExhausted, StoreFull, "there is no room for another model or answer; try later")
	if detail[*errdetails.RetryInfo](st) == nil {
		t.Error("no word on when to try again")
	}
}

// An uploaded model is named by its content, serves many jobs, and is forgotten when nobody wants it any more.
func TestUploadedModels(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{ModelLifetime: 200 * time.Millisecond}, &puppet{"tug", 1, h.solve})
	send := func(m *towpathv1.Model) string {
		t.Helper()
		stream, err := s.jobs.UploadModel(s.ctx())
		if err != nil {
			t.Fatal(err)
		}
		if err := wire.SendModel(m, stream.Send); err != nil {
			t.Fatal(err)
		}
		r, err := stream.CloseAndRecv()
		if err != nil {
			t.Fatal(err)
		}
		if left := time.Until(r.GetExpireTime().AsTime()); left > 200*time.Millisecond {
			t.Errorf("kept for %v", left)
		}
		return r.GetModelId()
	}
	id := send(smallest())
	asArray := smallest()
	asArray.Constraints[0].Constant = &towpathv1.Numbers{F64: &towpathv1.Array{Place: &towpathv1.Array_Data{Data: []byte{0, 0, 0, 0, 0, 0, 0xf0, 0xbf}}}} // -1
	if again := send(asArray); again != id || len(id) != 64 {
		t.Errorf("the same model has the names %s and %s", id, again)
	}
	named := func() (*towpathv1.SubmitJobResponse, error) {
		return s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_ModelId{ModelId: id}})
	}
	r, err := named()
	if err != nil {
		t.Fatal(err)
	}
	s.signal(h.began, "the solve")
	if r.GetJob().GetModelName() != "smallest" {
		t.Errorf("the model's name is %s", r.GetJob().GetModelName())
	}
	plan, err := s.routes.PlanRoutes(s.ctx(), &towpathv1.PlanRoutesRequest{Source: &towpathv1.PlanRoutesRequest_ModelId{ModelId: id}})
	if err != nil || len(plan.GetDemands()) == 0 {
		t.Errorf("planned %v (%v)", plan, err)
	}
	time.Sleep(300 * time.Millisecond) // past its time, but in use
	second, err := named()
	if err != nil {
		t.Errorf("a model in use was forgotten: %v", err)
	}
	close(h.finish)
	s.wait(r.GetJob().GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
	s.wait(second.GetJob().GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
	s.eventually("the end of the model", func() bool {
		_, err = named()
		return err != nil
	})
	refused(t, err, codes.NotFound, UnknownModel, "upload it again")
}

// Uploads share the store's limit, and give it back however they end.
func TestUploadsInProgressAreBounded(t *testing.T) {
	s := newStation(t, Config{StoreLimit: 1 << 20, UploadLimit: 1 << 20, UploadPause: 50 * time.Millisecond}, &puppet{"tug", 1, honestly})
	head := func(size uint64) []*towpathv1.UploadModelRequest {
		return []*towpathv1.UploadModelRequest{{Part: &towpathv1.UploadModelRequest_Head{Head: announcing(size)}}}
	}
	stalled, err := s.jobs.UploadModel(s.ctx())
	if err != nil {
		t.Fatal(err)
	}
	more := &towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Chunk{Chunk: &towpathv1.Chunk{Array: 1, Data: []byte{1}, Crc32C: 0xA016D052}}}
	for _, q := range append(head(900<<10), more) {
		if err := stalled.Send(q); err != nil {
			t.Fatal(err)
		}
	}
	s.eventually("the room that the upload takes", func() bool { return s.uploading() > 900<<10 })
	refused(t, s.upload(head(900<<10)), codes.ResourceExhausted, StoreFull, "there is no room for 921600 more bytes of uploads; try later")
	// The stalled one is given up, and its room is free again.
	err = stalled.RecvMsg(&towpathv1.UploadModelResponse{})
	refused(t, err, codes.DeadlineExceeded, UploadBroken, "nothing came for 50ms; upload again, without pauses")
	s.eventually("the room given back", func() bool { return s.uploading() == 0 })
	refused(t, s.upload(head(900<<10)), codes.InvalidArgument, UploadBroken, "array 1: it ends after 0 of 921600 bytes")
}

func TestListing(t *testing.T) {
	s := newStation(t, Config{Workers: 1}, &puppet{"tug", 1, honestly})
	var newest []string
	for k := range 7 {
		r, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: smallest()},
			Labels: map[string]string{"parity": fmt.Sprint(k % 2), "number": fmt.Sprint(k)}})
		if err != nil {
			t.Fatal(err)
		}
		newest = append([]string{r.GetJob().GetId()}, newest...)
		s.wait(r.GetJob().GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
	}
	walk := func(q *towpathv1.ListJobsRequest) (ids []string, pages int) {
		t.Helper()
		for {
			r, err := s.jobs.ListJobs(s.ctx(), q)
			if err != nil {
				t.Fatal(err)
			}
			pages++
			for _, job := range r.GetJobs() {
				ids = append(ids, job.GetId())
			}
			if r.GetNextPageToken() == "" {
				return ids, pages
			}
			q.PageToken = r.GetNextPageToken()
		}
	}
	for _, c := range []struct {
		q     *towpathv1.ListJobsRequest
		want  []string
		pages int
	}{
		{&towpathv1.ListJobsRequest{}, newest, 1},
		{&towpathv1.ListJobsRequest{PageSize: 3}, newest, 3},
		{&towpathv1.ListJobsRequest{PageSize: 7}, newest, 1},
		{&towpathv1.ListJobsRequest{PageSize: math.MaxInt32}, newest, 1},
		{&towpathv1.ListJobsRequest{PageSize: 2, Labels: map[string]string{"parity": "0"}}, []string{newest[0], newest[2], newest[4], newest[6]}, 2},
		{&towpathv1.ListJobsRequest{Labels: map[string]string{"parity": "0", "number": "4"}}, newest[2:3], 1},
		{&towpathv1.ListJobsRequest{Labels: map[string]string{"parity": "0", "number": "3"}}, nil, 1},
		{&towpathv1.ListJobsRequest{States: []towpathv1.JobState{towpathv1.JobState_JOB_STATE_FAILED, towpathv1.JobState_JOB_STATE_ANSWERED}}, newest, 1},
		{&towpathv1.ListJobsRequest{States: []towpathv1.JobState{towpathv1.JobState_JOB_STATE_FAILED}}, nil, 1},
	} {
		if got, pages := walk(c.q); !slices.Equal(got, c.want) || pages != c.pages {
			t.Errorf("%v: %d jobs on %d pages, want %d on %d\n%v\n%v", c.q, len(got), pages, len(c.want), c.pages, got, c.want)
		}
	}
}

// Pages end early rather than outgrow gRPC's limit on messages.
func TestPagesFitIntoMessages(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	labels := map[string]string{}
	for k := range maxLabels {
		labels[strings.Repeat("k", maxLabel-2)+fmt.Sprintf("%02d", k)] = strings.Repeat("v", maxLabel)
	}
	const n = 300 // of 16 KiB each
	for range n {
		if _, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: smallest()}, Labels: labels}); err != nil {
			t.Fatal(err)
		}
	}
	seen, token := 0, ""
	for {
		r, err := s.jobs.ListJobs(s.ctx(), &towpathv1.ListJobsRequest{PageSize: 1000, PageToken: token})
		if err != nil {
			t.Fatal(err)
		}
		seen += len(r.GetJobs())
		if token = r.GetNextPageToken(); token == "" {
			break
		}
	}
	if seen != n {
		t.Errorf("%d jobs were listed, want %d", seen, n)
	}
}
