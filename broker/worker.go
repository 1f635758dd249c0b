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
		b.running++
		b.mu.Unlock()
		b.process(id)
		b.mu.Lock()
		b.running--
		b.mu.Unlock()
	}
}

// process takes one job from waiting to its end.
func (b *Broker) process(id string) {
	defer func() {
		if x := recover(); x != nil {
			b.log.Error("job panicked", zap.String("job", id), zap.Any("panic", x), zap.Stack("stack"))
			b.fail(id, Internal, "internal fault; please report it with the job's id")
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
	b.solve(ctx, id, m, proposals, planned)
}

// logRoute writes the one line that says which way a job goes.
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
		if p.Route != nil {
			losers = append(losers, loser{Sheet: p.Sheet.Name, Seconds: p.Route.Toll.Seconds})
		} else if len(p.Unreachable.Reasons) > 0 {
			losers = append(losers, loser{Sheet: p.Sheet.Name, Why: p.Unreachable.Reasons[0]})
		}
	}
	b.log.Info("route chosen", zap.String("job", id), zap.String("model", modelID), zap.String("sheet", chosen.Sheet.Name),
		zap.String("version", chosen.Sheet.Version), zap.Bool("native", chosen.Native()), zap.Bool("proven", chosen.Proven),
		zap.Float64("toll_seconds", chosen.Toll.Seconds), zap.Float64("toll_bytes", chosen.Toll.Bytes),
		zap.Any("legs", wire.RouteToProto(chosen).GetLegs()), zap.Any("losers", losers))
}

// attempts is how many routes are tried when one fails or its answer does not pass: the best and the next best.
const attempts = 2

// solve runs a job over its routes and stores the answer.
func (b *Broker) solve(ctx context.Context, id string, m *model.Model, proposals []capability.Proposal, planned time.Duration) {
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
	o, tolerance := b.solveOptions(id, r.Job.GetOptions())
	var best *outcome
	var faults []error
	for i := 0; i < min(attempts, len(proposals)) && proposals[i].Route != nil && run.Err() == nil; i++ {
		out, err := b.planner.attempt(run, m, proposals[i].Route, o, tolerance)
		if err != nil {
			faults = append(faults, err)
			b.log.Error("attempt failed", zap.String("job", id), zap.String("sheet", proposals[i].Sheet.Name), zap.Error(err))
			continue
		}
		b.log.Info("attempt answered", zap.String("job", id), zap.String("sheet", proposals[i].Sheet.Name), zap.Stringer("verdict", out.report.Verdict),
			zap.Float64("toll_seconds", proposals[i].Route.Toll.Seconds), zap.Float64("seconds", out.answer.GetTimings().GetSolved().AsDuration().Seconds()))
		if best == nil || out.report.Verdict < best.report.Verdict {
			best = &out
		}
		if out.sound {
			break
		}
	}
	if ctx.Err() != nil { // withdrawn, expired, or the broker stops
		if !errors.Is(context.Cause(ctx), errEnded) {
			b.fail(id, Draining, "the server stopped during the solve; submit again")
		}
		return
	}
	if best == nil {
		if run.Err() != nil {
			b.fail(id, RunLimitReached, fmt.Sprintf("the solve reached its limit of %v without a point; ask for more time, or for less accuracy", limit))
			return
		}
		b.fail(id, BackendFailed, fmt.Sprintf("no back end could run: %v", errors.Join(faults...)))
		return
	}
	for _, f := range faults {
		best.answer.Note += fmt.Sprintf("; before that: %v", f)
	}
	best.answer.Timings.Planned = durationpb.New(planned)
	best.answer.Timings.Waited = durationpb.New(r.Job.GetStartTime().AsTime().Sub(r.Job.GetSubmitTime().AsTime()))
	b.store(id, best)
}

// solveOptions reads what a job asks of its solve.
func (b *Broker) solveOptions(id string, o *towpathv1.JobOptions) (backends.Options, float64) {
	b.mu.Lock()
	l := b.live[id]
	b.mu.Unlock()
	options := backends.Options{Tolerance: o.GetTolerance(), MaxIterations: int(o.GetMaxIterations()), MaxMemory: int64(b.cfg.MemoryLimit)}
	if o.GetMaxMemoryBytes() > 0 {
		options.MaxMemory = int64(o.GetMaxMemoryBytes())
	}
	options.Progress = func(p backends.Progress) {
		l.feed.step(&towpathv1.Progress{
			Iteration: uint32(p.Iteration), Primal: p.Primal, Dual: p.Dual, Gap: p.Gap, PrimalResidual: p.PrimalResidual,
			DualResidual: p.DualResidual, Step: p.Step, Elapsed: durationpb.New(p.Elapsed),
		}, time.Now())
	}
	// An answer is examined at the broker's tolerance, or at the job's when that is looser.
	return options, max(b.cfg.Tolerance, o.GetTolerance())
}

// store keeps the answer and ends the job.
func (b *Broker) store(id string, out *outcome) {
	raw, err := proto.Marshal(out.answer)
	if err == nil {
		err = b.blobs.Put(context.Background(), answerKey(id), raw)
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
