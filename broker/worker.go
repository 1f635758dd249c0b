package broker

import (
	"context"
	"errors"
	"fmt"
	"time"

	"towpath/backends"
	"towpath/broker/wire"
	"towpath/capability"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/protobuf/proto"
	"google.golang.org/protobuf/types/known/durationpb"
	"google.golang.org/protobuf/types/known/timestamppb"
)

// worker takes jobs from the queue until the broker drains.
func (b *Broker) worker() {
	for {
		b.mu.Lock()
		for len(b.queue) == 0 && !b.drains {
			b.work.Wait()
		}
		if b.drains {
			b.mu.Unlock()
			return
		}
		id := b.queue[0]
		b.queue = b.queue[1:]
		b.mu.Unlock()
		b.process(id)
	}
}

// process takes one job from waiting to its end.
func (b *Broker) process(id string) {
	defer func() {
		if x := recover(); x != nil {
			b.fail(id, Internal, b.panicked("job "+id, x).Error())
		}
	}()
	ctx, cancel := context.WithCancelCause(b.ctx)
	defer cancel(nil)
	b.mu.Lock()
	l := b.live[id]
	if l != nil {
		l.cancel = cancel
	}
	b.mu.Unlock()
	r, _, err := b.get(ctx, id)
	if err != nil || l == nil || ended(r.Job.GetState()) {
		return // withdrawn or expired in the queue
	}
	m, err := b.loadModel(ctx, r.Model)
	if err != nil {
		b.fail(id, Internal, fmt.Sprintf("the model could not be read back: %v", err))
		return
	}
	began := time.Now()
	proposals, err := b.planner.plan(capability.Summarize(m), r.Job.GetOptions(), b.cfg.MemoryLimit)
	if err != nil || proposals[0].Route == nil {
		b.fail(id, NoRoute, "no back end can take the model any more")
		return
	}
	planned := time.Since(began)
	if _, err := b.change(id, func(r *record) {
		r.Job.State = towpathv1.JobState_JOB_STATE_ROUTED
		r.Job.Route = wire.RouteToProto(proposals[0].Route)
	}); err != nil {
		return
	}
	b.logRoute(id, r.Model, proposals)
	b.solve(ctx, id, l, m, proposals, planned)
}

// logRoute writes the one line that says which way a job goes, and what it would have cost elsewhere.
func (b *Broker) logRoute(id, modelID string, proposals []capability.Proposal) {
	chosen := proposals[0].Route
	type loser struct {
		Sheet   string  `json:"sheet"`
		Seconds float64 `json:"toll_seconds,omitempty"`
		Why     string  `json:"why,omitempty"`
	}
	var losers []loser
	for i := range proposals[1:] {
		p := &proposals[1+i]
		switch {
		case p.Route != nil:
			losers = append(losers, loser{Sheet: p.Sheet.Name, Seconds: p.Route.Toll.Seconds})
		case len(p.Unreachable.Reasons) > 0:
			losers = append(losers, loser{Sheet: p.Sheet.Name, Why: clip(p.Unreachable.Reasons[0])})
		}
	}
	var runnersUp []float64
	for _, r := range proposals[0].RunnersUp {
		runnersUp = append(runnersUp, r.Toll.Seconds)
	}
	b.log.Info("route chosen", zap.String("job", id), zap.String("model", modelID), zap.String("sheet", chosen.Sheet.Name),
		zap.String("version", chosen.Sheet.Version), zap.Bool("native", chosen.Native()), zap.Bool("proven", chosen.Proven),
		zap.Float64("toll_seconds", chosen.Toll.Seconds), zap.Float64("toll_bytes", chosen.Toll.Bytes),
		zap.String("route", chosen.String()), zap.Float64s("runners_up_toll_seconds", runnersUp), zap.Any("losers", losers))
}

// attempts is how many routes are tried when one fails or its answer does not pass: the best and the next best.
const attempts = 2

// solve runs a job over its routes and stores the answer.
func (b *Broker) solve(ctx context.Context, id string, l *liveJob, m *model.Model, proposals []capability.Proposal, planned time.Duration) {
	r, err := b.change(id, func(r *record) {
		r.Job.State = towpathv1.JobState_JOB_STATE_RUNNING
		r.Job.StartTime = timestamppb.Now()
		r.Job.WaitingReason = ""
	})
	if err != nil {
		return
	}
	limit := b.cfg.RunLimit
	if d := r.Job.GetOptions().GetRunLimit(); d != nil {
		limit = min(limit, d.AsDuration())
	}
	run, cancel := context.WithTimeout(ctx, limit)
	defer cancel()
	o, tolerance := b.solveOptions(l.feed, r.Job.GetOptions())
	var tried []try
	for i := 0; i < min(attempts, len(proposals)) && proposals[i].Route != nil && run.Err() == nil; i++ {
		t := try{sheet: proposals[i].Sheet.Name}
		t.outcome, t.err = b.planner.attempt(run, m, proposals[i].Route, o, tolerance)
		b.logTry(id, &t)
		tried = append(tried, t)
		if t.err == nil && t.outcome.sound {
			break
		}
	}
	if ctx.Err() != nil { // withdrawn, expired, or the broker stops
		if !errors.Is(context.Cause(ctx), errEnded) {
			b.fail(id, Drained, "the server stopped during the solve; submit again")
		}
		return
	}
	best := bestOf(tried)
	switch {
	case best == nil && run.Err() != nil:
		b.fail(id, RunLimitReached, fmt.Sprintf("the solve reached its limit of %v without a point; ask for more time, or for less accuracy", limit))
		return
	case best == nil:
		reason, text := failure(tried)
		b.fail(id, reason, text)
		return
	}
	a := best.outcome.answer
	a.Note = clip(withOthers(a.Note, best, tried))
	a.Timings.Planned = durationpb.New(planned)
	a.Timings.Waited = durationpb.New(r.Job.GetStartTime().AsTime().Sub(r.Job.GetSubmitTime().AsTime()))
	b.store(id, best.outcome)
}

// try is one attempt of a job, over one route.
type try struct {
	sheet   string
	outcome *outcome // nil when err is set
	err     error
}

// logTry says how an attempt went; of a bug of ours, all there is.
func (b *Broker) logTry(id string, t *try) {
	var bug *bugError
	switch {
	case errors.As(t.err, &bug):
		b.log.Error("attempt failed by a bug", zap.String("job", id), zap.String("sheet", t.sheet), zap.Error(bug.cause), zap.ByteString("stack", bug.stack))
	case t.err != nil:
		b.log.Error("attempt failed", zap.String("job", id), zap.String("sheet", t.sheet), zap.Error(t.err))
	default:
		b.log.Info("attempt answered", zap.String("job", id), zap.String("sheet", t.sheet), zap.Stringer("verdict", t.outcome.report.Verdict),
			zap.Float64("toll_seconds", t.outcome.answer.GetRoute().GetToll().GetSeconds()),
			zap.Float64("seconds", t.outcome.answer.GetTimings().GetSolved().AsDuration().Seconds()))
	}
}

// bestOf returns the attempt with the best verdict, the earlier one on ties; nil when none answered.
func bestOf(tried []try) (best *try) {
	for i := range tried {
		if t := &tried[i]; t.err == nil && (best == nil || t.outcome.report.Verdict < best.outcome.report.Verdict) {
			best = t
		}
	}
	return best
}

// failure says why a job failed none of whose attempts answered.
func failure(tried []try) (Reason, string) {
	reason, text := BackendFailed, "no back end could run:"
	for _, t := range tried {
		var bug *bugError
		if errors.As(t.err, &bug) {
			reason = Internal
		}
		text += fmt.Sprintf("\n%s: %v", t.sheet, t.err)
	}
	return reason, text
}

// withOthers adds to the note of the best attempt what became of the others.
func withOthers(note string, best *try, tried []try) string {
	for i := range tried {
		t := &tried[i]
		switch {
		case t == best:
			continue
		case note != "":
			note += "\n"
		}
		if t.err != nil {
			note += fmt.Sprintf("%s was tried, too, and failed: %v", t.sheet, t.err)
		} else {
			note += fmt.Sprintf("%s was tried, too, and its answer is %s", t.sheet, t.outcome.report.Verdict)
		}
	}
	return note
}

// solveOptions reads what a job asks of its solve, and of the examination.
func (b *Broker) solveOptions(f *feed, o *towpathv1.JobOptions) (options backends.Options, tolerance float64) {
	options = backends.Options{
		Tolerance: o.GetTolerance(), MaxIterations: int(o.GetMaxIterations()),
		MaxMemory: int64(memoryOf(o, b.cfg.MemoryLimit)),
		Progress: func(p backends.Progress) {
			f.step(&towpathv1.Progress{
				Iteration: uint32(p.Iteration), Primal: p.Primal, Dual: p.Dual, Gap: p.Gap, PrimalResidual: p.PrimalResidual,
				DualResidual: p.DualResidual, Step: p.Step, Elapsed: durationpb.New(p.Elapsed),
			}, time.Now())
		},
	}
	if o.GetTolerance() > 0 {
		return options, o.GetTolerance()
	}
	return options, b.cfg.Tolerance
}

// store keeps the answer and ends the job.
func (b *Broker) store(id string, out *outcome) {
	raw, err := proto.Marshal(out.answer)
	if err == nil {
		b.mu.Lock()
		err = b.keep(context.Background(), answerKey(id), raw)
		b.mu.Unlock()
	}
	if err != nil {
		b.fail(id, StoreFull, fmt.Sprintf("the answer could not be stored: %v", err))
		return
	}
	_, err = b.change(id, func(r *record) {
		r.Job.State = towpathv1.JobState_JOB_STATE_ANSWERED
		r.Job.Route = out.answer.GetRoute()
		r.Job.Outcome, r.Job.Verdict = out.answer.GetOutcome(), out.answer.GetExamination().GetVerdict()
		r.Answer = answerKey(id)
	})
	if errors.Is(err, errEnded) { // withdrawn or expired at the last moment: that stands
		err = b.blobs.Delete(context.Background(), answerKey(id))
	}
	if err != nil {
		b.log.Error("ending a job", zap.String("job", id), zap.Error(err))
	}
}
