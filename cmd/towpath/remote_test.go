package main

import (
	"bytes"
	"context"
	"strings"
	"testing"
	"time"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/genproto/googleapis/rpc/errdetails"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/durationpb"
	"google.golang.org/protobuf/types/known/timestamppb"
)

const oneBlock = `{"name": "tiny", "blocks": [{"name": "x", "field": "FIELD_REAL", "rows": 1}]}`

func finished(state towpathv1.JobState, fault *towpathv1.Fault) func() (*towpathv1.Job, error) {
	return func() (*towpathv1.Job, error) {
		return &towpathv1.Job{Id: "j1", State: state, Fault: fault, ModelName: "tiny", Outcome: towpathv1.Outcome_OUTCOME_OPTIMAL,
			Verdict: towpathv1.Verdict_VERDICT_CHECKED}, nil
	}
}

func TestEveryOptionReachesTheBroker(t *testing.T) {
	s := &scripted{get: finished(towpathv1.JobState_JOB_STATE_ANSWERED, nil)}
	s.answer = streamOf(t, answered())
	code, out, stderr := towpath(t, oneBlock, "solve", "-", "--json", "--address", s.serve(t), "--sheet", "a/b", "--backend", "a", "--backend", "c",
		"--tolerance", "1e-6", "--max-iterations", "7", "--time-limit", "3s", "--memory-limit", "99", "--need-multipliers", "--need-certificates")
	if code != exitAnswered {
		t.Fatalf("code %d: %s", code, stderr)
	}
	if !proto.Equal(answerIn(t, out), answered()) {
		t.Errorf("the answer changed on its way:\n%s", out)
	}
	want := &towpathv1.JobOptions{Sheet: "a/b", Backends: []string{"a", "c"}, Tolerance: 1e-6, MaxIterations: 7,
		RunLimit: durationpb.New(3 * time.Second), MaxMemoryBytes: 99, NeedMultipliers: true, NeedCertificates: true}
	r := s.submitted[0]
	if !proto.Equal(r.GetOptions(), want) || r.GetModel().GetName() != "tiny" || len(r.GetRequestId()) != 36 {
		t.Errorf("the broker got %v", r)
	}
}

func TestJobsThatEndWithoutAnAnswer(t *testing.T) {
	for state, word := range map[towpathv1.JobState]string{
		towpathv1.JobState_JOB_STATE_FAILED: "failed", towpathv1.JobState_JOB_STATE_WITHDRAWN: "withdrawn", towpathv1.JobState_JOB_STATE_EXPIRED: "expired",
	} {
		s := &scripted{get: finished(state, &towpathv1.Fault{Reason: "SOME_REASON", Message: "because of the weather"})}
		address := s.serve(t)
		code, out, stderr := towpath(t, oneBlock, "solve", "-", "--address", address)
		if want := "towpath: job j1 " + word + ": because of the weather (SOME_REASON)\n"; code != exitUnanswered || out != "" || stderr != want {
			t.Errorf("solve: code %d, %q, want %q", code, stderr, want)
		}
		if code, _, stderr := towpath(t, "", "fetch", "j1", "--address", address); code != exitUnanswered || !strings.Contains(stderr, word) {
			t.Errorf("fetch: code %d, %q", code, stderr)
		}
	}
	s := &scripted{get: finished(towpathv1.JobState_JOB_STATE_RUNNING, nil)}
	if code, _, stderr := towpath(t, "", "fetch", "j1", "--address", s.serve(t)); code != exitUnanswered || !strings.Contains(stderr, "towpath watch j1") {
		t.Errorf("fetch of a running job: code %d, %q", code, stderr)
	}
}

func TestRefusalsAreExplainedOnOneLine(t *testing.T) {
	with := func(code codes.Code, message string, details ...proto.Message) error {
		s := status.New(code, message)
		for _, d := range details {
			s, _ = s.WithDetails(d.(interface {
				proto.Message
				Reset()
				String() string
				ProtoMessage()
			}))
		}
		return s.Err()
	}
	for _, c := range []struct {
		err  error
		code int
		says string
	}{
		{with(codes.InvalidArgument, "the model is invalid", &errdetails.BadRequest{FieldViolations: []*errdetails.BadRequest_FieldViolation{
			{Field: "constraints[3].terms[0]", Description: "there is no entry 9"}}}), exitUsage,
			"the model is invalid; constraints[3].terms[0]: there is no entry 9"},
		{with(codes.FailedPrecondition, "no route", &errdetails.PreconditionFailure{Violations: []*errdetails.PreconditionFailure_Violation{
			{Subject: "csdp", Description: "takes no complex cones"}}}), exitUnanswered, "no route; csdp: takes no complex cones"},
		{with(codes.ResourceExhausted, "the queue is full", &errdetails.RetryInfo{RetryDelay: durationpb.New(2 * time.Second)}), exitUnanswered,
			"the queue is full; try again in 2s"},
		{with(codes.Internal, "a bug"), exitUnreachable, "a bug"},
	} {
		s := &scripted{refuse: c.err}
		code, out, stderr := towpath(t, oneBlock, "solve", "-", "--address", s.serve(t))
		if code != c.code || out != "" || stderr != "towpath: "+c.says+"\n" {
			t.Errorf("code %d, %q; want %d, %q", code, stderr, c.code, c.says)
		}
	}
}

// TestInterruptWithdraws cancels, as Ctrl-C does, while the job runs: nobody would fetch its answer.
func TestInterruptWithdraws(t *testing.T) {
	s := &scripted{running: make(chan struct{})}
	address := s.serve(t)
	ctx, cancel := context.WithCancel(t.Context())
	go func() { <-s.running; cancel() }()
	var out, stderr bytes.Buffer
	code := run(ctx, []string{"solve", "-", "--address", address}, streams{in: strings.NewReader(oneBlock), out: &out, err: &stderr})
	if code != exitInterrupted || !strings.Contains(stderr.String(), "job j1 is withdrawn") || out.Len() > 0 {
		t.Errorf("code %d, %q", code, stderr.String())
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if len(s.withdrawn) != 1 || s.withdrawn[0] != "j1" {
		t.Errorf("withdrawn: %v", s.withdrawn)
	}
}

func TestWatchGoesOnWhereItBrokeOff(t *testing.T) {
	job := func(n uint64, state towpathv1.JobState) *towpathv1.WatchJobResponse {
		j, _ := finished(state, nil)()
		return &towpathv1.WatchJobResponse{Sequence: n, Event: &towpathv1.WatchJobResponse_Job{Job: j}}
	}
	s := &scripted{watch: func(attempt int, send func(*towpathv1.WatchJobResponse) error) error {
		if attempt == 1 {
			send(job(1, towpathv1.JobState_JOB_STATE_WAITING))
			send(&towpathv1.WatchJobResponse{Sequence: 2, Event: &towpathv1.WatchJobResponse_Idle{Idle: &towpathv1.Idle{}}})
			send(job(5, towpathv1.JobState_JOB_STATE_RUNNING))
			return status.Error(codes.Unavailable, "being replaced")
		}
		send(&towpathv1.WatchJobResponse{Sequence: 6, Event: &towpathv1.WatchJobResponse_Progress{Progress: &towpathv1.Progress{Iteration: 3}}})
		send(job(7, towpathv1.JobState_JOB_STATE_ANSWERED))
		return nil
	}}
	code, out, stderr := towpath(t, "", "watch", "j1", "--address", s.serve(t))
	if code != exitAnswered || stderr != "" {
		t.Errorf("code %d, %q", code, stderr)
	}
	lines := strings.Split(strings.TrimSpace(out), "\n")
	if len(lines) != 4 || lines[0] != "job j1 waiting" || lines[1] != "job j1 running" || !strings.HasPrefix(lines[2], "iteration   3") ||
		lines[3] != "job j1 answered: optimal, checked" {
		t.Errorf("got\n%s", out)
	}
	if len(s.watched) != 2 || s.watched[0] != 0 || s.watched[1] != 5 {
		t.Errorf("watched after %v, want 0 and 5", s.watched)
	}
}

func TestWatchGivesUp(t *testing.T) {
	s := &scripted{watch: func(int, func(*towpathv1.WatchJobResponse) error) error {
		return status.Error(codes.NotFound, "there is no job j1")
	}}
	code, _, stderr := towpath(t, "", "watch", "j1", "--address", s.serve(t))
	if code != exitUsage || !strings.Contains(stderr, "there is no job j1") || len(s.watched) != 1 {
		t.Errorf("code %d, %q after %d attempts", code, stderr, len(s.watched))
	}
}

func TestWithdraw(t *testing.T) {
	s := &scripted{}
	code, out, _ := towpath(t, "", "withdraw", "j9", "--address", s.serve(t))
	if code != exitAnswered || out != "job j9 withdrawn\n" || s.withdrawn[0] != "j9" {
		t.Errorf("code %d, %q", code, out)
	}
}

func TestJobsTurnsPages(t *testing.T) {
	at := timestamppb.New(time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC))
	end := timestamppb.New(at.AsTime().Add(250 * time.Millisecond))
	s := &scripted{pages: []*towpathv1.ListJobsResponse{
		{NextPageToken: "two", Jobs: []*towpathv1.Job{{Id: "a", State: towpathv1.JobState_JOB_STATE_ANSWERED, ModelName: "grid", SubmitTime: at, StartTime: at, EndTime: end,
			Outcome: towpathv1.Outcome_OUTCOME_OPTIMAL, Verdict: towpathv1.Verdict_VERDICT_CHECKED, Labels: map[string]string{"y": "2", "x": "1"}}}},
		{NextPageToken: "three", Jobs: []*towpathv1.Job{{Id: "b", State: towpathv1.JobState_JOB_STATE_WAITING, SubmitTime: at, WaitingReason: "both workers are busy"}}},
	}}
	code, out, stderr := towpath(t, "", "jobs", "--limit", "2", "--state", "answered", "--state", "waiting", "--label", "x=1", "--address", s.serve(t))
	if code != exitAnswered {
		t.Fatalf("code %d: %s", code, stderr)
	}
	for _, fact := range []string{"a    answered  optimal  checked", "250 ms", "grid", "x=1,y=2", "both workers are busy", "there are older jobs"} {
		if !strings.Contains(out, fact) {
			t.Errorf("no %q in\n%s", fact, out)
		}
	}
	if len(s.listed) != 2 || s.listed[0].GetPageSize() != 2 || s.listed[1].GetPageSize() != 1 || s.listed[1].GetPageToken() != "two" ||
		len(s.listed[1].GetStates()) != 2 || s.listed[0].GetLabels()["x"] != "1" {
		t.Errorf("asked for %v", s.listed)
	}
	s = &scripted{pages: []*towpathv1.ListJobsResponse{{}}}
	if _, out, _ := towpath(t, "", "jobs", "--address", s.serve(t)); out != "no jobs\n" {
		t.Errorf("an empty list: %q", out)
	}
}
