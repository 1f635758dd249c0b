package broker

import (
	"context"
	"fmt"
	"math"
	"runtime/debug"
	"slices"
	"time"

	"towpath/backends"
	"towpath/bridges"
	"towpath/broker/wire"
	"towpath/capability"
	"towpath/model"
	"towpath/model/check"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/types/known/durationpb"
)

// planner knows the registered back ends and finds routes to them.
type planner struct {
	drivers   map[string]backends.Driver // by sheet
	sheets    []*capability.Sheet
	rules     []capability.Rule
	catalogue []bridges.Bridge
}

func newPlanner(drivers []backends.Driver, catalogue []bridges.Bridge) (*planner, error) {
	p := &planner{drivers: map[string]backends.Driver{}, catalogue: catalogue}
	for _, b := range catalogue {
		p.rules = append(p.rules, b)
	}
	for _, d := range drivers {
		for _, s := range d.Sheets() {
			if s.Name == "" || s.Backend == "" || s.Toll == nil || len(s.Takes) == 0 {
				return nil, fmt.Errorf("sheet '%s' of back end '%s' lacks a name, a toll or kinds", s.Name, s.Backend)
			}
			if p.drivers[s.Name] != nil {
				return nil, fmt.Errorf("two back ends have the sheet %s", s.Name)
			}
			p.drivers[s.Name] = d
			p.sheets = append(p.sheets, &s)
		}
	}
	return p, nil
}

// plan returns the proposals of the sheets that the job allows: routes first, the chosen one at the head, then what is
// out of reach. Cheapest toll wins; the native route on ties, then the smaller name.
func (p *planner) plan(demands []capability.Demand, o *towpathv1.JobOptions, memoryLimit uint64) ([]capability.Proposal, error) {
	sheets, err := p.allowed(o)
	if err != nil {
		return nil, err
	}
	options := capability.Options{MaxBytes: float64(memoryOf(o, memoryLimit)), Need: capability.LiftsValues}
	if o.GetNeedMultipliers() {
		options.Need |= capability.LiftsMultipliers
	}
	if o.GetNeedCertificates() {
		options.Need |= capability.LiftsInfeasibility | capability.LiftsUnboundedness
	}
	proposals := capability.Plan(demands, p.rules, sheets, options)
	slices.SortStableFunc(proposals, func(a, b capability.Proposal) int { return compareProposals(&a, &b) })
	return proposals, nil
}

// memoryOf is what a solve may take: what the job asks for, at most the limit.
func memoryOf(o *towpathv1.JobOptions, limit uint64) uint64 {
	if m := o.GetMaxMemoryBytes(); m > 0 {
		return min(m, limit)
	}
	return limit
}

func compareProposals(a, b *capability.Proposal) int {
	switch {
	case (a.Route == nil) != (b.Route == nil):
		if a.Route != nil {
			return -1
		}
		return 1
	case a.Route == nil:
		return 0
	case a.Route.Toll.Seconds != b.Route.Toll.Seconds:
		if a.Route.Toll.Seconds < b.Route.Toll.Seconds {
			return -1
		}
		return 1
	case a.Route.Native() != b.Route.Native():
		if a.Route.Native() {
			return -1
		}
		return 1
	}
	return 0
}

// allowed picks the sheets that the job names, or all.
func (p *planner) allowed(o *towpathv1.JobOptions) ([]*capability.Sheet, error) {
	var names, found []string
	var out []*capability.Sheet
	for _, s := range p.sheets {
		names = append(names, s.Name)
		if (o.GetSheet() == "" || o.GetSheet() == s.Name) && (len(o.GetBackends()) == 0 || slices.Contains(o.GetBackends(), s.Backend)) {
			out = append(out, s)
		}
		found = append(found, s.Backend)
	}
	if len(out) == 0 {
		return nil, refuse(codes.FailedPrecondition, UnknownSheet, "no back end here has sheet '%s' and is one of %v; the sheets here are %v", o.GetSheet(), o.GetBackends(), names)
	}
	for _, b := range o.GetBackends() {
		if !slices.Contains(found, b) {
			return nil, refuse(codes.FailedPrecondition, UnknownSheet, "there is no back end '%s' here; the sheets here are %v", b, names)
		}
	}
	return out, nil
}

// outcome is what one attempt brought.
type outcome struct {
	answer *towpathv1.Answer
	report check.Report
	sound  bool // worth sending without trying elsewhere
}

// bugError is a fault of ours, or a back end's panic. Clients are told that much; the log has the rest.
type bugError struct {
	cause error
	stack []byte
}

// Error is what clients are told.
func (e *bugError) Error() string {
	return "internal fault; it is in the server's log, please report it"
}

// attempt takes a model over one route, solves, lifts and examines. Panics of bridges and drivers are contained.
func (p *planner) attempt(ctx context.Context, m *model.Model, r *capability.Route, o backends.Options, tolerance float64) (out *outcome, err error) {
	defer func() {
		if x := recover(); x != nil {
			out, err = nil, &bugError{fmt.Errorf("panic: %v", x), debug.Stack()}
		}
	}()
	began := time.Now()
	lap := func() *durationpb.Duration {
		d := time.Since(began)
		began = began.Add(d)
		return durationpb.New(d)
	}
	t := &towpathv1.Timings{}
	x, err := bridges.Cross(m, r, p.catalogue)
	if err != nil {
		return nil, &bugError{cause: err}
	}
	t.Lowered = lap()
	low, err := p.drivers[r.Sheet.Name].Solve(ctx, r.Sheet.Name, x.Lowered, o)
	if err != nil {
		return nil, err
	}
	t.Solved = lap()
	a := x.Lift(shaped(x.Lowered, low))
	t.Lifted = lap()
	out = &outcome{report: check.Examine(m, a, check.Tolerances{Residual: tolerance})}
	t.Examined = lap()
	out.sound = passed(&out.report) || a.Outcome == model.Stopped
	honest(a, &out.report)
	out.answer = wire.AnswerToProto(m, a)
	out.answer.Examination = wire.ExaminationToProto(&out.report)
	out.answer.Route = wire.RouteToProto(r)
	out.answer.Backend, out.answer.BackendVersion = r.Sheet.Backend, r.Sheet.Version
	out.answer.Timings = t
	return out, nil
}

// passed reports whether an examination supports what was claimed.
func passed(r *check.Report) bool { return r.Verdict == check.Checked || r.Verdict == check.Proved }

// honest takes back claims that the examination does not support: nothing leaves as infeasible or unbounded whose
// certificate did not pass, nor as optimal when it is refuted. The note says what was claimed.
func honest(a *model.Answer, r *check.Report) {
	claimed := a.Outcome
	certificate := claimed == model.Infeasible || claimed == model.Unbounded
	switch {
	case certificate && !passed(r):
		a.Note = fmt.Sprintf("the back end claimed %s; its certificate is %s. %s", claimed, r.Verdict, a.Note)
	case claimed == model.Optimal && r.Verdict == check.Refuted:
		a.Note = "the back end claimed an optimum; the examination contradicts it. " + a.Note
	default:
		return
	}
	a.Outcome = model.Inaccurate
}

// shaped drops parts of a back end's answer that do not have the lowered model's shape: lifting trusts shapes, and a
// hostile or broken back end must not make it panic. The examiner then says what is missing.
func shaped(m *model.Model, a *model.Answer) *model.Answer {
	if a == nil {
		return &model.Answer{Outcome: model.Inaccurate, Objective: math.NaN(), Bound: math.NaN(), Note: "the back end returned nothing"}
	}
	out := *a
	if out.Outcome == model.OutcomeUnknown || out.Outcome > model.Stopped {
		out.Outcome = model.Inaccurate
	}
	out.Iterations = max(0, out.Iterations)
	out.Point, out.Ray = shapedPoint(m, a.Point), shapedPoint(m, a.Ray)
	out.Multipliers, out.Farkas = shapedMultipliers(m, a.Multipliers), shapedMultipliers(m, a.Farkas)
	return &out
}

func shapedPoint(m *model.Model, p *model.Point) *model.Point {
	if p == nil || len(p.Values) != len(m.Blocks) {
		return nil
	}
	for k := range m.Blocks {
		if len(p.Values[k]) != m.Blocks[k].Entries() {
			return nil
		}
	}
	return p
}

func shapedMultipliers(m *model.Model, y *model.Multipliers) *model.Multipliers {
	if y == nil || len(y.Constraints) != len(m.Constraints) {
		return nil
	}
	for k := range m.Constraints {
		if len(y.Constraints[k]) != m.Constraints[k].Map.Rows() {
			return nil
		}
	}
	for k := range m.Blocks {
		if m.Blocks[k].Bounds != nil && (len(y.Bounds) != len(m.Blocks) || len(y.Bounds[k]) != m.Blocks[k].Entries()) {
			return nil
		}
	}
	return y
}
