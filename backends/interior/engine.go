package interior

import (
	"context"
	"math"
	"time"

	"towpath/backends"
)

// ending says how an iteration ended.
type ending uint8

const (
	endOptimal ending = iota
	endInfeasible
	endUnbounded
	endStuck   // no further progress, or the iteration limit
	endStopped // the context ended
)

const (
	defaultTolerance  = 1e-8
	defaultIterations = 200
	// certificates are judged at this residual; looser ones are taken only when the iteration is stuck anyway
	looseCertificate = 1e-6
	// A certificate's residual times its size stays near rounding for an infeasible model and of order one for a weakly
	// infeasible one, whose certificates get better only by growing.
	certificateProduct = 1e-5
	stepFraction       = 0.99
	leastStep          = 1e-9
	leastCentering     = 1e-8
	// A direction that leaves more than this share of the residuals is compared with those of the other regularities.
	inexact = 1e-2
	// Iterations after the tolerance is met, and by how much each has to improve.
	polishing  = 5
	polishGain = 0.5
)

// run iterates until the standard form shows one of its ends, and returns the iterate that shows it. Mehrotra's
// predictor-corrector (1992) on the embedding, one step length for all variables.
func (f *form) run(ctx context.Context, o backends.Options) (end ending, last *state, m measure, iterations int) {
	began := time.Now()
	tolerance, limit := o.Tolerance, o.MaxIterations
	if tolerance == 0 {
		tolerance = defaultTolerance
	}
	if limit == 0 {
		limit = defaultIterations
	}
	s := f.initial()
	v := &newton{f: f, k: newKKT(f)}
	best, bestM := s.clone(), measure{primal: math.Inf(1)}
	var proof *state // best certificate so far
	var proofM measure
	proofResidual, proofEnd := math.Inf(1), endStuck
	polished := 0
	stop := func(end ending, iterations int) (ending, *state, measure, int) {
		if bestM.worst() <= tolerance {
			return endOptimal, best, bestM, iterations
		}
		if proofResidual <= looseCertificate && bestM.worst() > looseCertificate && end == endStuck {
			return proofEnd, proof, proofM, iterations
		}
		return end, best, bestM, iterations
	}
	step := 0.0
	for iter := 0; ; iter++ {
		r := f.residuals(s)
		m := f.measure(s, r)
		if o.Progress != nil {
			o.Progress(backends.Progress{Iteration: iter, Primal: m.primalValue + f.constant, Dual: m.dualValue + f.constant, Gap: m.gap,
				PrimalResidual: m.primal, DualResidual: m.dual, Step: step, Elapsed: time.Since(began)})
		}
		gained := m.worst() < polishGain*bestM.worst()
		if m.worst() < bestM.worst() {
			best, bestM = s.clone(), m
		}
		if bestM.worst() <= tolerance {
			// Values are as sharp as the tolerance, points and multipliers only as its root: go on while it pays.
			if polished++; !gained || polished > polishing {
				return endOptimal, best, bestM, iter
			}
		}
		if m.infeasible < proofResidual && m.infeasible*(1+m.ySize) <= certificateProduct {
			proof, proofM, proofResidual, proofEnd = s.clone(), m, m.infeasible, endInfeasible
		}
		if m.unbounded < proofResidual && m.unbounded*(1+m.xSize) <= certificateProduct {
			proof, proofM, proofResidual, proofEnd = s.clone(), m, m.unbounded, endUnbounded
		}
		if proofResidual <= tolerance {
			return proofEnd, proof, proofM, iter
		}
		if ctx.Err() != nil {
			return stop(endStopped, iter)
		}
		if iter == limit {
			return stop(endStuck, iter)
		}
		var d *direction
		if f.scale(s) {
			d, step = v.firmest(s, r)
		}
		if d == nil || !(step >= leastStep) {
			return stop(endStuck, iter)
		}
		s.move(d, step)
		if t := max(s.tau, s.kappa); t > 1e3 || t < 1e-3 {
			s.times(1 / t)
		}
	}
}

// scale takes the scalings of all cones.
func (f *form) scale(s *state) (ok bool) {
	for i, it := range f.items {
		if !it.scale(s.p[i], s.q[i]) {
			return false
		}
	}
	return true
}

// firmest finds the direction and the step of one iteration. It begins with the regularity that served last; where that
// leaves the direction inexact it tries the others and takes the one after which the least is left of the residuals.
func (v *newton) firmest(s *state, r *residuals) (best *direction, step float64) {
	least, chosen := math.Inf(1), v.firm
	v.k.form()
	for k := range firmness {
		level := (v.firm + k) % len(firmness)
		v.k.regularity = firmness[level]
		if !v.prepare(s) {
			continue
		}
		d, short := v.predictCorrect(r)
		alpha := min(1, stepFraction*v.f.step(s, d, 1/stepFraction))
		if after := 1 - alpha + alpha*short; after < least {
			best, step, least, chosen = d, alpha, after, level
		}
		if short <= inexact {
			break
		}
	}
	v.firm = chosen
	return best, step
}

// predictCorrect finds a direction, and the share of the residuals that it fails to address.
func (v *newton) predictCorrect(r *residuals) (d *direction, short float64) {
	f, s := v.f, v.s
	mu := f.mu(s)
	pair := make([][]float64, len(f.items))
	for i, it := range f.items {
		pair[i] = make([]float64, it.dim())
		it.corrector(pair[i], 0, nil, nil)
	}
	affine, _ := v.solve(r, 1, pair, -s.tau*s.kappa)
	alpha := f.step(s, affine, 1)
	sigma := max(math.Pow(1-alpha, 3), leastCentering)
	for i, it := range f.items {
		it.corrector(pair[i], sigma*mu, affine.p[i], affine.q[i])
	}
	d, left := v.solve(r, 1-sigma, pair, sigma*mu-s.tau*s.kappa-affine.tau*affine.kappa)
	return d, left / max(r.size(), math.SmallestNonzeroFloat64)
}

// step is the largest common step, at most limit.
func (f *form) step(s *state, d *direction, limit float64) float64 {
	if d.tau < 0 {
		limit = min(limit, -s.tau/d.tau)
	}
	if d.kappa < 0 {
		limit = min(limit, -s.kappa/d.kappa)
	}
	for i, it := range f.items {
		limit = it.step(s.p[i], d.p[i], s.q[i], d.q[i], limit)
	}
	return limit
}
