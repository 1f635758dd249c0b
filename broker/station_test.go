package broker

import (
	"bytes"
	"context"
	"errors"
	"io"
	"math"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"

	"towpath/backends"
	"towpath/broker/wire"
	"towpath/capability"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
	"go.uber.org/zap/zaptest/observer"
	"google.golang.org/genproto/googleapis/rpc/errdetails"
	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/types/known/durationpb"
)

// patience is how long a test waits for what must happen.
const patience = time.Minute

// puppet is a back end that does what a test says.
type puppet struct {
	name  string
	toll  float64 // seconds, whatever the load
	solve func(ctx context.Context, m *model.Model, o backends.Options) (*model.Answer, error)
}

func (p *puppet) Sheets() []capability.Sheet {
	kind := func(place capability.Place, c model.ConeKind) capability.Kind {
		return capability.Kind{Place: place, Field: model.Real, Cone: c}
	}
	return []capability.Sheet{{
		Name: p.name + "/real", Backend: p.name, Version: "1", Returns: capability.LiftsAll, Accuracy: 1e-9,
		Takes: map[capability.Kind]int{
			kind(capability.OnBlock, model.Nonneg): 0, kind(capability.OnBlock, model.Free): 0,
			kind(capability.OnMap, model.Nonneg): 0, kind(capability.OnMap, model.Zero): 0,
		},
		Toll: func(l capability.Load) capability.Toll {
			count := 0
			for _, d := range l {
				count += d.Count
			}
			return capability.Toll{Seconds: p.toll, Bytes: 100 * float64(count)}
		},
	}}
}

func (p *puppet) Solve(ctx context.Context, _ string, m *model.Model, o backends.Options) (*model.Answer, error) {
	return p.solve(ctx, m, o)
}

// smallest is: minimize x, x - 1 >= 0, x >= 0. The optimum is 1, at x = 1 with multiplier 1.
func smallest() *towpathv1.Model {
	return &towpathv1.Model{
		Name:      "smallest",
		Blocks:    []*towpathv1.Block{{Name: "x", Field: towpathv1.Field_FIELD_REAL, Rows: 1, Cone: towpathv1.Cone_CONE_NONNEG}},
		Objective: &towpathv1.Objective{Terms: []*towpathv1.Term{{Of: &towpathv1.Term_Block{Block: "x"}, Re: 1}}},
		Constraints: []*towpathv1.Constraint{{
			Name: "at least one", Field: towpathv1.Field_FIELD_REAL, Rows: 1, Cone: towpathv1.Cone_CONE_NONNEG,
			Terms: []*towpathv1.Term{{Of: &towpathv1.Term_Block{Block: "x"}, Re: 1}}, Constant: &towpathv1.Numbers{Re: []float64{-1}},
		}},
	}
}

// impossible is: -x - 1 >= 0, x >= 0. The multiplier 1 shows that there is no point.
func impossible() *towpathv1.Model {
	m := smallest()
	m.Constraints[0].Terms[0].Re = -1
	return m
}

// right is the answer to smallest.
func right() *model.Answer {
	return &model.Answer{
		Outcome: model.Optimal, Objective: 1, Bound: 1, Iterations: 3,
		Point:       &model.Point{Values: [][]complex128{{1}}},
		Multipliers: &model.Multipliers{Constraints: [][]complex128{{1}}, Bounds: [][]complex128{nil}},
	}
}

// Ways of a back end.
func honestly(context.Context, *model.Model, backends.Options) (*model.Answer, error) {
	return right(), nil
}

func failing(context.Context, *model.Model, backends.Options) (*model.Answer, error) {
	return nil, errors.New("no licence")
}

func panicking(context.Context, *model.Model, backends.Options) (*model.Answer, error) {
	panic("secret of the house")
}

func answering(a *model.Answer) func(context.Context, *model.Model, backends.Options) (*model.Answer, error) {
	return func(context.Context, *model.Model, backends.Options) (*model.Answer, error) { return a, nil }
}

// hanging solves until it is told to stop, or to finish.
type hanging struct {
	began, ended chan struct{}
	finish       chan struct{}
}

func newHanging() *hanging {
	return &hanging{began: make(chan struct{}, 100), ended: make(chan struct{}, 100), finish: make(chan struct{})}
}

func (h *hanging) solve(ctx context.Context, _ *model.Model, _ backends.Options) (*model.Answer, error) {
	h.began <- struct{}{}
	defer func() { h.ended <- struct{}{} }()
	select {
	case <-ctx.Done():
		a := right()
		a.Outcome = model.Stopped
		return a, nil
	case <-h.finish:
		return right(), nil
	}
}

// station is a broker under test, reached over gRPC.
type station struct {
	t      *testing.T
	b      *Broker
	server *Server
	conn   *grpc.ClientConn
	jobs   towpathv1.JobServiceClient
	routes towpathv1.RouteServiceClient
	log    *observer.ObservedLogs
	close  func()
}

// newStation starts a broker. When the test ends it is stopped, and nothing of it may be left running.
func newStation(t *testing.T, cfg Config, drivers ...backends.Driver) *station {
	t.Helper()
	core, log := observer.New(zapcore.DebugLevel)
	if cfg.Grace == 0 {
		cfg.Grace = 10 * time.Millisecond
	}
	b, err := New(cfg, drivers, []Absent{{"ferry", "install the Debian package ferry"}}, zap.New(core))
	if err != nil {
		t.Fatal(err)
	}
	server := NewServer(b)
	conn, closeAll, err := server.Embed()
	if err != nil {
		t.Fatal(err)
	}
	s := &station{t: t, b: b, server: server, conn: conn, jobs: towpathv1.NewJobServiceClient(conn), routes: towpathv1.NewRouteServiceClient(conn), log: log, close: closeAll}
	t.Cleanup(func() {
		s.close()
		nothingLeft(t)
	})
	return s
}

// nothingLeft fails when goroutines of this project's own are still there after a while.
func nothingLeft(t *testing.T) {
	t.Helper()
	var left []string
	for deadline := time.Now().Add(5 * time.Second); time.Now().Before(deadline); time.Sleep(5 * time.Millisecond) {
		buf := make([]byte, 1<<20)
		buf = buf[:runtime.Stack(buf, true)]
		left = nil
		for g := range bytes.SplitSeq(buf, []byte("\n\n")) {
			if bytes.Contains(g, []byte("towpath/broker")) && !bytes.Contains(g, []byte("testing.tRunner")) {
				left = append(left, string(g))
			}
		}
		if len(left) == 0 {
			return
		}
	}
	t.Errorf("%d goroutines are left:\n%s", len(left), strings.Join(left, "\n\n"))
}

func (s *station) ctx() context.Context {
	ctx, cancel := context.WithTimeout(context.Background(), patience)
	s.t.Cleanup(cancel)
	return ctx
}

func (s *station) try(m *towpathv1.Model, o *towpathv1.JobOptions) (*towpathv1.Job, error) {
	r, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: m}, Options: o})
	return r.GetJob(), err
}

func (s *station) submit(m *towpathv1.Model, o *towpathv1.JobOptions) string {
	s.t.Helper()
	job, err := s.try(m, o)
	if err != nil {
		s.t.Fatalf("submit: %v", err)
	}
	return job.GetId()
}

func (s *station) job(id string) *towpathv1.Job {
	s.t.Helper()
	r, err := s.jobs.GetJob(s.ctx(), &towpathv1.GetJobRequest{JobId: id})
	if err != nil {
		s.t.Fatalf("get: %v", err)
	}
	return r.GetJob()
}

// wait returns a job that must end in the given state.
func (s *station) wait(id string, state towpathv1.JobState) *towpathv1.Job {
	s.t.Helper()
	r, err := s.jobs.GetJob(s.ctx(), &towpathv1.GetJobRequest{JobId: id, Wait: durationpb.New(patience)})
	if err != nil {
		s.t.Fatalf("get: %v", err)
	}
	if r.GetJob().GetState() != state {
		s.t.Fatalf("the job is %v: %v; want %v", r.GetJob().GetState(), r.GetJob().GetFault(), state)
	}
	return r.GetJob()
}

func (s *station) withdraw(id string) *towpathv1.Job {
	s.t.Helper()
	r, err := s.jobs.WithdrawJob(s.ctx(), &towpathv1.WithdrawJobRequest{JobId: id})
	if err != nil {
		s.t.Fatalf("withdraw: %v", err)
	}
	return r.GetJob()
}

func (s *station) fetch(id string) (*towpathv1.Answer, error) {
	stream, err := s.jobs.FetchAnswer(s.ctx(), &towpathv1.FetchAnswerRequest{JobId: id})
	if err != nil {
		return nil, err
	}
	return wire.ReceiveAnswer(stream.Recv)
}

// answer solves a model and returns its answer.
func (s *station) answer(m *towpathv1.Model, o *towpathv1.JobOptions) *towpathv1.Answer {
	s.t.Helper()
	id := s.submit(m, o)
	s.wait(id, towpathv1.JobState_JOB_STATE_ANSWERED)
	a, err := s.fetch(id)
	if err != nil {
		s.t.Fatalf("fetch: %v", err)
	}
	return a
}

// watch returns all events of a job until its stream ends, and how it ended.
func (s *station) watch(id string, after uint64) ([]*towpathv1.WatchJobResponse, error) {
	stream, err := s.jobs.WatchJob(s.ctx(), &towpathv1.WatchJobRequest{JobId: id, AfterSequence: after})
	if err != nil {
		return nil, err
	}
	var events []*towpathv1.WatchJobResponse
	for {
		e, err := stream.Recv()
		if errors.Is(err, io.EOF) {
			return events, nil
		}
		if err != nil {
			return events, err
		}
		events = append(events, e)
	}
}

// eventually waits until something holds that no signal tells of.
func (s *station) eventually(what string, holds func() bool) {
	s.t.Helper()
	for deadline := time.Now().Add(patience); !holds(); time.Sleep(time.Millisecond) {
		if time.Now().After(deadline) {
			s.t.Fatalf("%s did not come", what)
		}
	}
}

// uploading returns the bytes that uploads in progress take.
func (s *station) uploading() int64 {
	s.b.mu.Lock()
	defer s.b.mu.Unlock()
	return s.b.uploading
}

func (s *station) signal(c <-chan struct{}, what string) {
	s.t.Helper()
	select {
	case <-c:
	case <-time.After(patience):
		s.t.Fatalf("%s did not happen", what)
	}
}

// refused checks code, reason and text of a refusal.
func refused(t *testing.T, err error, code codes.Code, reason Reason, text string) *status.Status {
	t.Helper()
	st := status.Convert(err)
	if st.Code() != code || reasonOf(st) != reason || !strings.Contains(st.Message(), text) {
		t.Errorf("refused with %v %s: %s\nwant %v %s: %s", st.Code(), reasonOf(st), st.Message(), code, reason, text)
	}
	return st
}

func reasonOf(st *status.Status) Reason {
	for _, d := range st.Details() {
		if info, ok := d.(*errdetails.ErrorInfo); ok && info.GetDomain() == "towpath" {
			return Reason(info.GetReason())
		}
	}
	return ""
}

func detail[T any](st *status.Status) (found T) {
	for _, d := range st.Details() {
		if x, ok := d.(T); ok {
			return x
		}
	}
	return found
}

func statesOf(events []*towpathv1.WatchJobResponse) (out []towpathv1.JobState) {
	for _, e := range events {
		if e.GetJob() != nil {
			out = append(out, e.GetJob().GetState())
		}
	}
	return out
}

var wholeLife = []towpathv1.JobState{
	towpathv1.JobState_JOB_STATE_WAITING, towpathv1.JobState_JOB_STATE_ROUTED, towpathv1.JobState_JOB_STATE_RUNNING, towpathv1.JobState_JOB_STATE_ANSWERED,
}

// near reports whether two numbers agree to many digits.
func near(a, b float64) bool { return math.Abs(a-b) < 1e-12 }

// sorted returns a sorted copy.
func sorted(x []string) []string { return slices.Sorted(slices.Values(x)) }
