package broker

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"
	"unicode/utf8"

	"towpath/backends"
	"towpath/capability"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/genproto/googleapis/rpc/errdetails"
	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/durationpb"
)

// Every way to ask wrongly, with code, reason and the exact words.
func TestRefusedRequests(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	submit := func(q *towpathv1.SubmitJobRequest) func(context.Context) error {
		return func(ctx context.Context) error { _, err := s.jobs.SubmitJob(ctx, q); return err }
	}
	inline := &towpathv1.SubmitJobRequest_Model{Model: smallest()}
	options := func(o *towpathv1.JobOptions) func(context.Context) error {
		return submit(&towpathv1.SubmitJobRequest{Source: inline, Options: o})
	}
	labels := func(l map[string]string) func(context.Context) error {
		return submit(&towpathv1.SubmitJobRequest{Source: inline, Labels: l})
	}
	many := map[string]string{}
	for k := range maxLabels + 1 {
		many[fmt.Sprint(k)] = ""
	}
	long := strings.Repeat("x", 300)
	broken := smallest()
	broken.Objective.Terms[0].Of = &towpathv1.Term_Block{Block: "y"}
	invalidModel := smallest()
	invalidModel.Constraints[0].Constant.Re[0] = math.NaN()
	foreign := smallest()
	foreign.Blocks[0] = &towpathv1.Block{Name: "x", Field: towpathv1.Field_FIELD_COMPLEX, Rows: 1}
	foreign.Constraints[0].Field, foreign.Constraints[0].Cone = towpathv1.Field_FIELD_SYMMETRIC, towpathv1.Cone_CONE_PSD
	foreign.Constraints[0].Rows, foreign.Constraints[0].Terms[0].Row = 3, []uint64{0, 0}
	foreign.Constraints[0].Constant = nil
	list := func(q *towpathv1.ListJobsRequest) func(context.Context) error {
		return func(ctx context.Context) error { _, err := s.jobs.ListJobs(ctx, q); return err }
	}
	for _, c := range []struct {
		call   func(context.Context) error
		code   codes.Code
		reason Reason
		field  string
		text   string
	}{
		{submit(&towpathv1.SubmitJobRequest{}), codes.InvalidArgument, RequestInvalid, "source", "the request: it has no model; give model, or the model_id of an uploaded one"},
		{submit(&towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{}}), codes.InvalidArgument, ModelInvalid, "blocks", "the model: it has no blocks; give at least one block of decision variables"},
		{submit(&towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_ModelId{ModelId: "abc"}}), codes.NotFound, UnknownModel, "", "there is no uploaded model 'abc'; uploaded models are kept for a while only: upload it again"},
		{submit(&towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: broken}}), codes.InvalidArgument, ModelInvalid, "objective.terms[0].block", "the objective: there is no block 'y'; use the name of a block, or block_number"},
		{submit(&towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: invalidModel}}), codes.InvalidArgument, ModelInvalid, "constraints[0].map.const", "constraint 0 'at least one', row 0: the constant is (NaN+0i); send finite numbers"},
		{submit(&towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: foreign}}), codes.FailedPrecondition, NoRoute, "", "no back end here can take this model:\nmap/symmetric/psd"},
		{submit(&towpathv1.SubmitJobRequest{Source: inline, RequestId: long}), codes.InvalidArgument, RequestInvalid, "request_id", "the request: request_id has 300 bytes; use at most 128"},
		{options(&towpathv1.JobOptions{Tolerance: -1}), codes.InvalidArgument, RequestInvalid, "options.tolerance", "the options: the tolerance is -1; use a number from 0 (the default) to less than 1"},
		{options(&towpathv1.JobOptions{Tolerance: 1}), codes.InvalidArgument, RequestInvalid, "options.tolerance", "the options: the tolerance is 1; use a number from 0 (the default) to less than 1"},
		{options(&towpathv1.JobOptions{Tolerance: math.NaN()}), codes.InvalidArgument, RequestInvalid, "options.tolerance", "the options: the tolerance is NaN; use a number from 0 (the default) to less than 1"},
		{options(&towpathv1.JobOptions{RunLimit: durationpb.New(-time.Second)}), codes.InvalidArgument, RequestInvalid, "options.run_limit", "the options: run_limit is not a positive duration; give seconds, or leave it out for the server's limit"},
		{options(&towpathv1.JobOptions{LifeLimit: &durationpb.Duration{}}), codes.InvalidArgument, RequestInvalid, "options.life_limit", "the options: life_limit is not a positive duration; give seconds, or leave it out for the server's limit"},
		{options(&towpathv1.JobOptions{LifeLimit: &durationpb.Duration{Seconds: 1, Nanos: -1}}), codes.InvalidArgument, RequestInvalid, "options.life_limit", "the options: life_limit is not a positive duration; give seconds, or leave it out for the server's limit"},
		{options(&towpathv1.JobOptions{MaxMemoryBytes: 1 << 63}), codes.InvalidArgument, RequestInvalid, "options.max_memory_bytes", "the options: max_memory_bytes is larger than any machine; leave it 0 for the server's limit"},
		{options(&towpathv1.JobOptions{MaxIterations: 1 << 31}), codes.InvalidArgument, RequestInvalid, "options.max_iterations", "the options: max_iterations is 2147483648; use at most 2147483647, or 0 for the back end's default"},
		{options(&towpathv1.JobOptions{Sheet: long}), codes.InvalidArgument, RequestInvalid, "options.sheet", "the options: a name has 300 bytes; use at most 256"},
		{options(&towpathv1.JobOptions{Backends: []string{"tug", long}}), codes.InvalidArgument, RequestInvalid, "options.backends[1]", "the options: a name has 300 bytes; use at most 256"},
		{options(&towpathv1.JobOptions{Backends: make([]string, 33)}), codes.InvalidArgument, RequestInvalid, "options.backends", "the options: there are 33 back ends; name at most 32"},
		{options(&towpathv1.JobOptions{Sheet: "tug/complex"}), codes.FailedPrecondition, UnknownSheet, "", "no back end here has sheet 'tug/complex' and is one of []; the sheets here are [tug/real]"},
		{options(&towpathv1.JobOptions{Backends: []string{"tug", "barge"}}), codes.FailedPrecondition, UnknownSheet, "", "there is no back end 'barge' here; the sheets here are [tug/real]"},
		{options(&towpathv1.JobOptions{MaxMemoryBytes: 1}), codes.FailedPrecondition, NoRoute, "", "0.001 kB are allowed"},
		{labels(many), codes.InvalidArgument, RequestInvalid, "labels", "the labels: there are 33; use at most 32"},
		{labels(map[string]string{"": "v"}), codes.InvalidArgument, RequestInvalid, "labels", "the labels: one is empty or too long; use keys of 1 to 256 bytes and values of at most 256"},
		{labels(map[string]string{"k": long}), codes.InvalidArgument, RequestInvalid, "labels", "the labels: one is empty or too long; use keys of 1 to 256 bytes and values of at most 256"},
		{list(&towpathv1.ListJobsRequest{PageSize: -1}), codes.InvalidArgument, RequestInvalid, "page_size", "the request: page_size is -1; use 0 for the usual size, or up to 1000"},
		{list(&towpathv1.ListJobsRequest{PageToken: "x"}), codes.InvalidArgument, RequestInvalid, "page_token", "the request: page_token is not one of ours; use the token of an earlier response"},
		{func(ctx context.Context) error {
			_, err := s.jobs.GetJob(ctx, &towpathv1.GetJobRequest{JobId: "x"})
			return err
		}, codes.NotFound, UnknownJob, "", "there is no job 'x'; ended jobs are kept for a while only"},
		{func(ctx context.Context) error {
			_, err := s.jobs.GetJob(ctx, &towpathv1.GetJobRequest{JobId: "x", Wait: durationpb.New(-1)})
			return err
		}, codes.InvalidArgument, RequestInvalid, "wait", "the request: wait is not a duration of zero or more; give seconds, or leave it out"},
		{func(ctx context.Context) error {
			_, err := s.jobs.WithdrawJob(ctx, &towpathv1.WithdrawJobRequest{JobId: "x"})
			return err
		}, codes.NotFound, UnknownJob, "", "there is no job 'x'; ended jobs are kept for a while only"},
		{func(context.Context) error { _, err := s.fetch("x"); return err }, codes.NotFound, UnknownJob, "", "there is no job 'x'; ended jobs are kept for a while only"},
		{func(ctx context.Context) error {
			_, err := s.routes.PlanRoutes(ctx, &towpathv1.PlanRoutesRequest{})
			return err
		}, codes.InvalidArgument, RequestInvalid, "source", "the request: it has no model; give model, or the model_id of an uploaded one"},
		{func(ctx context.Context) error {
			_, err := s.routes.PlanRoutes(ctx, &towpathv1.PlanRoutesRequest{Source: &towpathv1.PlanRoutesRequest_ModelId{ModelId: "abc"}})
			return err
		}, codes.NotFound, UnknownModel, "", "there is no uploaded model 'abc'; uploaded models are kept for a while only: upload it again"},
		{func(ctx context.Context) error {
			_, err := s.routes.PlanRoutes(ctx, &towpathv1.PlanRoutesRequest{Source: &towpathv1.PlanRoutesRequest_Model{Model: smallest()}, Options: &towpathv1.JobOptions{Tolerance: 2}})
			return err
		}, codes.InvalidArgument, RequestInvalid, "options.tolerance", "the options: the tolerance is 2; use a number from 0 (the default) to less than 1"},
		{func(context.Context) error { return s.upload(nil) }, codes.InvalidArgument, UploadBroken, "part", "the stream: it is empty; send the head first"},
		{func(context.Context) error {
			return s.upload([]*towpathv1.UploadModelRequest{{Part: &towpathv1.UploadModelRequest_Chunk{Chunk: &towpathv1.Chunk{}}}})
		}, codes.InvalidArgument, UploadBroken, "part", "the stream: it does not begin with a head; send the head first"},
		{func(context.Context) error {
			return s.upload([]*towpathv1.UploadModelRequest{{Part: &towpathv1.UploadModelRequest_Head{Head: announcing(8)}}, {Part: &towpathv1.UploadModelRequest_Chunk{Chunk: &towpathv1.Chunk{Array: 1, Data: make([]byte, 8)}}}})
		}, codes.InvalidArgument, UploadBroken, "chunk", "array 1: the chunk at byte 0 does not match its checksum; send it again; the checksum is CRC-32C"},
		{func(context.Context) error {
			return s.upload([]*towpathv1.UploadModelRequest{{Part: &towpathv1.UploadModelRequest_Head{Head: announcing(1 << 40)}}})
		}, codes.ResourceExhausted, ModelTooLarge, "", "the announced arrays are larger than the 1073741824 bytes taken; split the model, or ask for a higher limit"},
	} {
		st := refused(t, c.call(s.ctx()), c.code, c.reason, c.text)
		violations := detail[*errdetails.BadRequest](st).GetFieldViolations()
		switch {
		case c.field == "" && len(violations) > 0:
			t.Errorf("%s: violations %v", c.text, violations)
		case c.field != "" && (len(violations) == 0 || violations[0].GetField() != c.field || violations[0].GetDescription() != st.Message()):
			t.Errorf("%s: violations %v, want field %s", c.text, violations, c.field)
		}
	}
	if jobs, err := s.jobs.ListJobs(s.ctx(), &towpathv1.ListJobsRequest{}); err != nil || len(jobs.GetJobs()) != 0 {
		t.Errorf("refused requests left %d jobs (%v)", len(jobs.GetJobs()), err)
	}
}

// announcing is smallest with the constant as an upload of so many bytes.
func announcing(size uint64) *towpathv1.Model {
	m := smallest()
	m.Constraints[0].Constant = &towpathv1.Numbers{F64: &towpathv1.Array{Place: &towpathv1.Array_Upload{Upload: &towpathv1.Upload{Id: 1, SizeBytes: size}}}}
	return m
}

// upload plays messages to the server and returns how it ends.
func (s *station) upload(messages []*towpathv1.UploadModelRequest) error {
	stream, err := s.jobs.UploadModel(s.ctx())
	if err != nil {
		return err
	}
	for _, q := range messages {
		if stream.Send(q) != nil {
			break // the server has ended the stream and says why
		}
	}
	_, err = stream.CloseAndRecv()
	return err
}

// However many faults a model has, the error stays small enough for a trailer, and says how many there are.
func TestManyFaultsMakeASmallError(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	m := smallest()
	for range 500 {
		c := proto.CloneOf(m.GetConstraints()[0])
		c.Name, c.Constant.Re[0] = "", math.Inf(1)
		m.Constraints = append(m.Constraints, c)
	}
	_, err := s.try(m, nil)
	st := refused(t, err, codes.InvalidArgument, ModelInvalid, "constraint 1, row 0: the constant is (+Inf+0i); send finite numbers")
	if n := len(detail[*errdetails.BadRequest](st).GetFieldViolations()); n < 10 || n > shownFaults {
		t.Errorf("%d violations", n)
	}
	lines := strings.Split(st.Message(), "\n")
	more := 0
	if _, err := fmt.Sscanf(lines[len(lines)-1], "and %d more faults", &more); err != nil || len(lines)-1+more != 500 {
		t.Errorf("%d faults are listed, then: %s", len(lines)-1, lines[len(lines)-1])
	}
	if n := trailerBytes(t, st); n > 8<<10 {
		t.Errorf("the error takes %d bytes of trailers", n)
	}
}

// trailerBytes is what a status takes in HTTP/2 trailers: the message, and all of it again in base64.
func trailerBytes(t *testing.T, st *status.Status) int {
	t.Helper()
	return len(st.Message()) + proto.Size(st.Proto())*4/3
}

// Words from anywhere fit into messages and records: bounded, and valid UTF-8.
func TestForeignWordsAreClipped(t *testing.T) {
	noise := strings.Repeat("\xff\xfe loud \n", 10_000)
	noted := right()
	noted.Note = noise
	s := newStation(t, Config{}, &puppet{"noisy", 1, answering(noted)}, &puppet{"broken", 1, func(context.Context, *model.Model, backends.Options) (*model.Answer, error) {
		return nil, errors.New(noise)
	}})
	a := s.answer(smallest(), &towpathv1.JobOptions{Backends: []string{"noisy"}})
	if n := len(a.GetNote()); n < 100 || n > shownText+10 {
		t.Errorf("the note has %d bytes", n)
	}
	job := s.wait(s.submit(smallest(), &towpathv1.JobOptions{Backends: []string{"broken"}}), towpathv1.JobState_JOB_STATE_FAILED)
	if n := len(job.GetFault().GetMessage()); n < 100 || n > shownText+10 {
		t.Errorf("the fault has %d bytes", n)
	}
	_, err := s.try(smallest(), &towpathv1.JobOptions{Sheet: strings.Repeat("é", 128), Backends: slices.Repeat([]string{strings.Repeat("x", 256)}, 32)})
	st := refused(t, err, codes.FailedPrecondition, UnknownSheet, "no back end here has sheet")
	if n := trailerBytes(t, st); n > 8<<10 {
		t.Errorf("the error takes %d bytes of trailers", n)
	}
	if got := clip(strings.Repeat("é", shownText)); !utf8.ValidString(got) || len(got) > shownText+3 {
		t.Errorf("clipped to %d bytes", len(got))
	}
}

// Errors of other kinds get their code, too; what is not foreseen is internal and does not show a stack.
func TestStatusOfOtherErrors(t *testing.T) {
	for _, c := range []struct {
		err  error
		code codes.Code
	}{
		{context.Canceled, codes.Canceled}, {context.DeadlineExceeded, codes.DeadlineExceeded},
		{fmt.Errorf("reading: %w", context.Canceled), codes.Canceled}, {errors.New("unforeseen"), codes.Internal},
		{&model.FaultError{Faults: make([]model.Fault, 40)}, codes.InvalidArgument},
	} {
		st := statusAsProto(t, c.err)
		if codes.Code(st.GetCode()) != c.code {
			t.Errorf("%v gives %v", c.err, st)
		}
	}
	if statusOf(nil) != nil {
		t.Error("no error became one")
	}
}

// A panicking handler ends its call and nothing else.
func TestPanicInAHandlerIsContained(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	_, err := s.server.settleUnary(t.Context(), nil, &grpc.UnaryServerInfo{FullMethod: "/m"}, func(context.Context, any) (any, error) { panic("secret") })
	st := refused(t, err, codes.Internal, Internal, "internal fault")
	if strings.Contains(st.Message(), "secret") {
		t.Errorf("the client is told %s", st.Message())
	}
	err = s.server.settleStream(nil, nil, &grpc.StreamServerInfo{FullMethod: "/m"}, func(any, grpc.ServerStream) error { panic("secret") })
	refused(t, err, codes.Internal, Internal, "internal fault")
	if n := s.log.FilterMessage("panic contained").FilterField(zap.String("where", "/m")).Len(); n != 2 {
		t.Errorf("%d lines in the log", n)
	}
}

func TestConfigurationsThatCannotWork(t *testing.T) {
	for _, cfg := range []Config{
		{Workers: -1}, {QueueLimit: -1}, {Retain: -1}, {StoreLimit: -1}, {UploadLimit: math.MaxUint64}, {UploadPause: -1}, {ModelLifetime: -1}, {RunLimit: -1},
		{LifeLimit: -1}, {MemoryLimit: math.MaxUint64}, {Grace: -1}, {Idle: -1}, {Tolerance: -1}, {Tolerance: 1}, {Tolerance: math.NaN()},
	} {
		if _, err := New(cfg, nil, nil, zap.NewNop()); err == nil {
			t.Errorf("accepted %+v", cfg)
		}
	}
	twin := &puppet{"tug", 1, honestly}
	if _, err := New(Config{}, []backends.Driver{twin, twin}, nil, zap.NewNop()); err == nil || err.Error() != "two back ends have the sheet tug/real" {
		t.Errorf("twins: %v", err)
	}
	if _, err := New(Config{}, []backends.Driver{blank{}}, nil, zap.NewNop()); err == nil {
		t.Error("a sheet without anything was accepted")
	}
	cfg := Config{}.withDefaults()
	if err := cfg.validate(); err != nil || cfg.MemoryLimit == 0 || cfg.Workers < 1 || len(cfg.Catalogue) == 0 {
		t.Errorf("defaults %+v: %v", cfg, err)
	}
}

// blank is a back end with an empty sheet.
type blank struct{}

func (blank) Sheets() []capability.Sheet { return []capability.Sheet{{}} }

func (blank) Solve(context.Context, string, *model.Model, backends.Options) (*model.Answer, error) {
	return nil, nil
}

func TestMemTotal(t *testing.T) {
	if got := memTotal([]byte("MemFree: 1 kB\nMemTotal:       2048 kB\n"), 7); got != 2<<20 {
		t.Errorf("read %d", got)
	}
	for _, text := range []string{"", "MemTotal:\n", "MemTotal: x kB\n", "MemTotal: 99999999999999999999 kB\n"} {
		if got := memTotal([]byte(text), 7); got != 7 {
			t.Errorf("%q: read %d", text, got)
		}
	}
	if machineMemory() < 64<<20 {
		t.Errorf("this machine has %d bytes", machineMemory())
	}
}
