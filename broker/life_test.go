package broker

import (
	"context"
	"fmt"
	"math/cmplx"
	"slices"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/genproto/googleapis/rpc/errdetails"
	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/types/known/durationpb"
)

// The whole way of one job: states, events, answer, log.
func TestJobFromWaitingToAnswered(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly}, &puppet{"slow", 2, honestly})
	id := s.submit(smallest(), nil)
	job := s.wait(id, towpathv1.JobState_JOB_STATE_ANSWERED)
	if job.GetOutcome() != towpathv1.Outcome_OUTCOME_OPTIMAL || job.GetVerdict() != towpathv1.Verdict_VERDICT_CHECKED || job.GetRoute().GetSheet() != "tug/real" {
		t.Errorf("the job says %v", job)
	}
	if job.GetStartTime() == nil || job.GetEndTime().AsTime().Before(job.GetSubmitTime().AsTime()) || job.GetModelName() != "smallest" {
		t.Errorf("the job says %v", job)
	}
	a, err := s.fetch(id)
	if err != nil {
		t.Fatal(err)
	}
	if x := a.GetValues()[0].GetEntries().GetRe(); len(x) != 1 || x[0] != 1 || a.GetValues()[0].GetName() != "x" {
		t.Errorf("values %v", a.GetValues())
	}
	if y := a.GetMultipliers().GetConstraints()[0]; y.GetName() != "at least one" || y.GetValues().GetRe()[0] != 1 {
		t.Errorf("multipliers %v", y)
	}
	if !near(a.GetObjective(), 1) || !near(a.GetExamination().GetObjective(), 1) || a.GetBackend() != "tug" || a.GetBackendVersion() != "1" || a.GetIterations() != 3 {
		t.Errorf("answer %v", a)
	}
	for name, d := range map[string]*durationpb.Duration{
		"waited": a.GetTimings().GetWaited(), "planned": a.GetTimings().GetPlanned(), "lowered": a.GetTimings().GetLowered(),
		"solved": a.GetTimings().GetSolved(), "lifted": a.GetTimings().GetLifted(), "examined": a.GetTimings().GetExamined(),
	} {
		if d == nil || d.AsDuration() < 0 {
			t.Errorf("%s: %v", name, d)
		}
	}
	events, err := s.watch(id, 0)
	if err != nil || !slices.Equal(statesOf(events), wholeLife) {
		t.Errorf("watching the ended job gives %v (%v)", statesOf(events), err)
	}
	lines := s.log.FilterMessage("route chosen").All()
	if len(lines) != 1 {
		t.Fatalf("%d lines say which route was chosen", len(lines))
	}
	line := lines[0].ContextMap()
	if line["job"] != id || line["sheet"] != "tug/real" || line["toll_seconds"] != 1.0 || len(fmt.Sprint(line["model"])) != 64 || !strings.Contains(fmt.Sprint(line["losers"]), "slow/real") ||
		!strings.Contains(fmt.Sprint(line["route"]), "map/real/nonneg") {
		t.Errorf("the line says %v", line)
	}
	if n := s.log.FilterMessage("job changed").Len(); n != len(wholeLife) {
		t.Errorf("%d lines for %d states", n, len(wholeLife))
	}
	if n := s.log.FilterMessage("back end absent").Len(); n != 1 {
		t.Errorf("%d lines for one absent back end", n)
	}
}

func TestWithdrawStopsTheSolve(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Workers: 1}, &puppet{"tug", 1, h.solve})
	id := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	if job := s.withdraw(id); job.GetState() != towpathv1.JobState_JOB_STATE_WITHDRAWN || job.GetFault().GetReason() != "WITHDRAWN" || job.GetEndTime() == nil {
		t.Errorf("withdrawn: %v", job)
	}
	s.signal(h.ended, "the end of the solve")
	if again := s.withdraw(id); again.GetState() != towpathv1.JobState_JOB_STATE_WITHDRAWN {
		t.Errorf("withdrawn twice: %v", again)
	}
	_, err := s.fetch(id)
	refused(t, err, codes.FailedPrecondition, NoAnswer, "is withdrawn and has no answer: withdrawn by the client")
	// The worker is free again.
	close(h.finish)
	other := s.submit(smallest(), nil)
	s.wait(other, towpathv1.JobState_JOB_STATE_ANSWERED)
	// What has ended stays as it is.
	if job := s.withdraw(other); job.GetState() != towpathv1.JobState_JOB_STATE_ANSWERED {
		t.Errorf("an answered job was withdrawn: %v", job)
	}
	if job := s.job(id); job.GetState() != towpathv1.JobState_JOB_STATE_WITHDRAWN {
		t.Errorf("the withdrawn job is %v", job.GetState())
	}
}

func TestWithdrawInTheQueue(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Workers: 1}, &puppet{"tug", 1, h.solve})
	first := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	second, third := s.submit(smallest(), nil), s.submit(smallest(), nil)
	if why := s.job(third).GetWaitingReason(); why != "all 1 workers are busy; 1 jobs are before this one" {
		t.Errorf("it waits because %s", why)
	}
	s.withdraw(second)
	if why := s.job(third).GetWaitingReason(); why != "all 1 workers are busy; 0 jobs are before this one" {
		t.Errorf("it waits because %s", why)
	}
	close(h.finish)
	s.wait(first, towpathv1.JobState_JOB_STATE_ANSWERED)
	s.wait(third, towpathv1.JobState_JOB_STATE_ANSWERED)
	if n := len(h.began); n != 1 {
		t.Errorf("%d solves after the first, want that of the third job only", n)
	}
}

func TestExpiry(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Workers: 1}, &puppet{"tug", 1, h.solve})
	life := func(d time.Duration) *towpathv1.JobOptions {
		return &towpathv1.JobOptions{LifeLimit: durationpb.New(d)}
	}
	runs, waits := s.submit(smallest(), life(400*time.Millisecond)), s.submit(smallest(), life(30*time.Millisecond))
	for _, id := range []string{runs, waits} {
		if job := s.wait(id, towpathv1.JobState_JOB_STATE_EXPIRED); job.GetFault().GetReason() != string(LifeLimitReached) {
			t.Errorf("fault %v", job.GetFault())
		}
	}
	s.signal(h.ended, "the end of the solve")
	if len(h.began) != 1 {
		t.Errorf("%d solves began, want 1", len(h.began))
	}
}

func TestRunLimit(t *testing.T) {
	h := newHanging()
	stubborn := func(ctx context.Context, _ *model.Model, _ backends.Options) (*model.Answer, error) {
		<-ctx.Done()
		return nil, ctx.Err()
	}
	s := newStation(t, Config{}, &puppet{"tug", 1, h.solve}, &puppet{"stubborn", 2, stubborn})
	limit := durationpb.New(30 * time.Millisecond)
	a := s.answer(smallest(), &towpathv1.JobOptions{RunLimit: limit, Backends: []string{"tug"}})
	if a.GetOutcome() != towpathv1.Outcome_OUTCOME_STOPPED || len(a.GetValues()) != 1 {
		t.Errorf("the best point so far came as %v %v", a.GetOutcome(), a.GetValues())
	}
	id := s.submit(smallest(), &towpathv1.JobOptions{RunLimit: limit, Backends: []string{"stubborn"}})
	if job := s.wait(id, towpathv1.JobState_JOB_STATE_FAILED); job.GetFault().GetReason() != string(RunLimitReached) {
		t.Errorf("fault %v", job.GetFault())
	}
}

func TestQueueFull(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{Workers: 1, QueueLimit: 2}, &puppet{"tug", 1, h.solve})
	running := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	waiting := s.submit(smallest(), nil)
	last := s.submit(smallest(), nil)
	_, err := s.try(smallest(), nil)
	st := refused(t, err, codes.ResourceExhausted, QueueFull, "2 jobs wait, which is the limit; try later")
	if retry := detail[*errdetails.RetryInfo](st); retry.GetRetryDelay().AsDuration() <= 0 {
		t.Errorf("no delay for a retry: %v", st.Details())
	}
	s.withdraw(waiting)
	s.submit(smallest(), nil)
	if got := len(s.log.FilterMessage("job changed").FilterField(zap.String("state", "waiting")).All()); got != 4 {
		t.Errorf("%d jobs were accepted, want 4", got)
	}
	close(h.finish)
	s.wait(running, towpathv1.JobState_JOB_STATE_ANSWERED)
	s.wait(last, towpathv1.JobState_JOB_STATE_ANSWERED)
}

// What fails, panics or lies is followed by the next best; what cannot be helped is told as it is.
func TestFaultyBackEnds(t *testing.T) {
	liar := right()
	liar.Point.Values[0][0], liar.Objective = 0.5, 0.5
	for _, c := range []struct {
		name          string
		first, second func(context.Context, *model.Model, backends.Options) (*model.Answer, error)
		outcome       towpathv1.Outcome
		verdict       towpathv1.Verdict
		backend, note string
	}{
		{"fails, then right", failing, honestly, towpathv1.Outcome_OUTCOME_OPTIMAL, towpathv1.Verdict_VERDICT_CHECKED, "second",
			"first/real was tried, too, and failed: no licence"},
		{"panics, then right", panicking, honestly, towpathv1.Outcome_OUTCOME_OPTIMAL, towpathv1.Verdict_VERDICT_CHECKED, "second",
			"first/real was tried, too, and failed: internal fault; it is in the server's log, please report it"},
		{"lies, then right", answering(liar), honestly, towpathv1.Outcome_OUTCOME_OPTIMAL, towpathv1.Verdict_VERDICT_CHECKED, "second",
			"first/real was tried, too, and its answer is refuted"},
		{"lies, then fails", answering(liar), failing, towpathv1.Outcome_OUTCOME_INACCURATE, towpathv1.Verdict_VERDICT_REFUTED, "first",
			"the back end claimed an optimum; the examination contradicts it. \nsecond/real was tried, too, and failed: no licence"},
		{"both lie", answering(liar), answering(liar), towpathv1.Outcome_OUTCOME_INACCURATE, towpathv1.Verdict_VERDICT_REFUTED, "first",
			"the back end claimed an optimum; the examination contradicts it. \nsecond/real was tried, too, and its answer is refuted"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := newStation(t, Config{}, &puppet{"second", 2, c.second}, &puppet{"first", 1, c.first})
			a := s.answer(smallest(), nil)
			if a.GetOutcome() != c.outcome || a.GetExamination().GetVerdict() != c.verdict || a.GetBackend() != c.backend || a.GetNote() != c.note {
				t.Errorf("got %v %v from %s, note %q\nwant %v %v from %s, note %q", a.GetOutcome(), a.GetExamination().GetVerdict(), a.GetBackend(), a.GetNote(),
					c.outcome, c.verdict, c.backend, c.note)
			}
			if n := s.log.FilterMessage("route chosen").Len(); n != 1 {
				t.Errorf("%d lines say which route was chosen", n)
			}
		})
	}
}

func TestNoBackEndCouldRun(t *testing.T) {
	s := newStation(t, Config{}, &puppet{"first", 1, failing}, &puppet{"second", 2, failing}, &puppet{"third", 3, honestly})
	job := s.wait(s.submit(smallest(), nil), towpathv1.JobState_JOB_STATE_FAILED)
	if f := job.GetFault(); f.GetReason() != "BACKEND_FAILED" || f.GetMessage() != "no back end could run:\nfirst/real: no licence\nsecond/real: no licence" {
		t.Errorf("fault %v", f)
	}
}

// A panic ends its job and nothing else, and its words stay in the log.
func TestPanicIsContained(t *testing.T) {
	var calls atomic.Int32
	once := func(ctx context.Context, m *model.Model, o backends.Options) (*model.Answer, error) {
		if calls.Add(1) == 1 {
			return panicking(ctx, m, o)
		}
		return right(), nil
	}
	s := newStation(t, Config{Workers: 1}, &puppet{"tug", 1, once})
	job := s.wait(s.submit(smallest(), nil), towpathv1.JobState_JOB_STATE_FAILED)
	if f := job.GetFault(); f.GetReason() != "INTERNAL" || strings.Contains(f.GetMessage(), "secret") || strings.Contains(f.GetMessage(), ".go:") {
		t.Errorf("fault %v", f)
	}
	lines := s.log.FilterMessage("attempt failed by a bug").All()
	if len(lines) != 1 || !strings.Contains(fmt.Sprint(lines[0].ContextMap()["error"]), "secret of the house") {
		t.Errorf("the log says %v", lines)
	}
	s.wait(s.submit(smallest(), nil), towpathv1.JobState_JOB_STATE_ANSWERED)
}

// Claims of infeasibility go out only with a certificate that passes.
func TestClaimsNeedCertificates(t *testing.T) {
	proof := func(y complex128) *model.Multipliers {
		return &model.Multipliers{Constraints: [][]complex128{{y}}, Bounds: [][]complex128{nil}}
	}
	s := newStation(t, Config{}, &puppet{"good", 1, answering(&model.Answer{Outcome: model.Infeasible, Farkas: proof(1)})},
		&puppet{"bare", 1, answering(&model.Answer{Outcome: model.Infeasible})},
		&puppet{"wrong", 1, answering(&model.Answer{Outcome: model.Infeasible, Farkas: proof(-1), Note: "own words"})},
		&puppet{"boundless", 1, answering(&model.Answer{Outcome: model.Unbounded, Ray: &model.Point{Values: [][]complex128{{1}}}})})
	only := func(backend string) *towpathv1.JobOptions { return &towpathv1.JobOptions{Backends: []string{backend}} }
	a := s.answer(impossible(), only("good"))
	if a.GetOutcome() != towpathv1.Outcome_OUTCOME_INFEASIBLE || a.GetExamination().GetVerdict() != towpathv1.Verdict_VERDICT_CHECKED {
		t.Errorf("a proof that holds came as %v %v: %v", a.GetOutcome(), a.GetExamination().GetVerdict(), a.GetExamination().GetReasons())
	}
	if y := a.GetCertificate().GetInfeasibility().GetConstraints()[0].GetValues().GetRe(); len(y) != 1 || y[0] != 1 {
		t.Errorf("certificate %v", a.GetCertificate())
	}
	for backend, word := range map[string]string{"bare": "infeasible", "wrong": "infeasible", "boundless": "unbounded"} {
		a := s.answer(impossible(), only(backend))
		if a.GetOutcome() != towpathv1.Outcome_OUTCOME_INACCURATE || !strings.HasPrefix(a.GetNote(), "the back end claimed "+word+"; its certificate is ") {
			t.Errorf("%s came as %v %v, note %q", backend, a.GetOutcome(), a.GetExamination().GetVerdict(), a.GetNote())
		}
	}
}

// Answers of any shape: none of them passes, none does harm.
func TestMalformedAnswers(t *testing.T) {
	nan := right()
	nan.Point.Values[0][0] = cmplx.NaN()
	noPoint, long, noRows, noBlocks, strange, negative := right(), right(), right(), right(), right(), right()
	noPoint.Point = nil
	long.Point.Values[0] = []complex128{1, 2}
	noRows.Multipliers.Constraints = nil
	noBlocks.Point.Values = nil
	strange.Outcome, strange.Point = 200, nil
	negative.Iterations, negative.Point.Values[0][0] = -5, -7
	for k, a := range []*model.Answer{nil, {}, nan, noPoint, long, noRows, noBlocks, strange, negative} {
		t.Run(fmt.Sprint(k), func(t *testing.T) {
			s := newStation(t, Config{}, &puppet{"tug", 1, answering(a)})
			got := s.answer(smallest(), nil)
			if v := got.GetExamination().GetVerdict(); v != towpathv1.Verdict_VERDICT_REFUTED && v != towpathv1.Verdict_VERDICT_DOUBTFUL {
				t.Errorf("verdict %v on %+v", v, a)
			}
			if _, known := towpathv1.Outcome_name[int32(got.GetOutcome())]; !known || got.GetOutcome() == towpathv1.Outcome_OUTCOME_UNSPECIFIED {
				t.Errorf("outcome %v", got.GetOutcome())
			}
			if got.GetIterations() > 3 {
				t.Errorf("%d iterations", got.GetIterations())
			}
		})
	}
}

// Somebody who waits and leaves does not stop the job.
func TestLeavingDoesNotWithdraw(t *testing.T) {
	h := newHanging()
	s := newStation(t, Config{}, &puppet{"tug", 1, h.solve})
	id := s.submit(smallest(), nil)
	s.signal(h.began, "the solve")
	ctx, cancel := context.WithTimeout(t.Context(), 20*time.Millisecond)
	defer cancel()
	if _, err := s.jobs.GetJob(ctx, &towpathv1.GetJobRequest{JobId: id, Wait: durationpb.New(time.Minute)}); err == nil {
		t.Error("the wait ended without its deadline")
	}
	stream, err := s.jobs.WatchJob(ctx, &towpathv1.WatchJobRequest{JobId: id})
	for err == nil {
		_, err = stream.Recv()
	}
	close(h.finish)
	s.wait(id, towpathv1.JobState_JOB_STATE_ANSWERED)
}

// Options reach the back end, limits of the server stand.
func TestOptionsReachTheBackEnd(t *testing.T) {
	seen := make(chan backends.Options, 1)
	s := newStation(t, Config{MemoryLimit: 1 << 30}, &puppet{"tug", 1, func(_ context.Context, _ *model.Model, o backends.Options) (*model.Answer, error) {
		seen <- o
		return right(), nil
	}})
	s.answer(smallest(), &towpathv1.JobOptions{Tolerance: 1e-4, MaxIterations: 77, MaxMemoryBytes: 1 << 40})
	if o := <-seen; o.Tolerance != 1e-4 || o.MaxIterations != 77 || o.MaxMemory != 1<<30 || o.Progress == nil {
		t.Errorf("options %+v", o)
	}
	s.answer(smallest(), &towpathv1.JobOptions{MaxMemoryBytes: 1 << 20})
	if o := <-seen; o.MaxMemory != 1<<20 {
		t.Errorf("memory %d", o.MaxMemory)
	}
}

// The job's tolerance decides the examination: off by 1e-5 passes at 1e-4 and not at the default.
func TestToleranceDecidesTheVerdict(t *testing.T) {
	off := right()
	off.Point.Values[0][0], off.Objective = 1-1e-5, 1-1e-5
	s := newStation(t, Config{}, &puppet{"tug", 1, answering(off)})
	if v := s.answer(smallest(), &towpathv1.JobOptions{Tolerance: 1e-4}).GetExamination().GetVerdict(); v != towpathv1.Verdict_VERDICT_CHECKED {
		t.Errorf("at 1e-4: %v", v)
	}
	if v := s.answer(smallest(), nil).GetExamination().GetVerdict(); v == towpathv1.Verdict_VERDICT_CHECKED {
		t.Errorf("at the default: %v", v)
	}
}
