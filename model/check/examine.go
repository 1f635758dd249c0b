package check

import (
	"math"
	"slices"

	"towpath/model"
)

// Examine checks an answer against the model, which must be valid. It never fails: whatever is missing or malformed is
// said in the report.
func Examine(m *model.Model, a *model.Answer, t Tolerances) Report {
	if t.Residual == 0 {
		t.Residual = DefaultResidual
	}
	e := &examiner{m: m, tol: t.Residual, r: blank()}
	if a == nil {
		e.r.because(Refuted, "there is no answer")
		return e.r
	}
	if bad := misshapen(m, a); bad != "" {
		e.r.because(Refuted, "%s", bad)
		return e.r
	}
	switch a.Outcome {
	case model.Infeasible:
		e.infeasible(a.Farkas)
	case model.Unbounded:
		e.unbounded(a)
	default:
		e.solution(a)
	}
	return e.r
}

type examiner struct {
	m   *model.Model
	tol float64
	r   Report

	claimed bool // that the point is optimal
	price   float64
	missed  float64 // largest violation of the point, absolute
	strayed float64 // largest violation of the multipliers, absolute
}

// solution examines a point and its multipliers.
func (e *examiner) solution(a *model.Answer) {
	e.claimed = a.Outcome == model.Optimal
	nan := math.NaN()
	for k := range e.m.Constraints {
		e.r.Constraints = append(e.r.Constraints, ConstraintResiduals{k, e.m.Constraints[k].Name, nan, nan, nan, nan})
	}
	for b := range e.m.Blocks {
		e.r.Blocks = append(e.r.Blocks, BlockResiduals{b, e.m.Blocks[b].Name, nan, nan, nan, nan})
	}
	if a.Point == nil {
		v := Doubtful
		if e.claimed {
			v = Refuted
		}
		e.r.because(v, "there is no point")
		return
	}
	values := e.primal(a)
	if a.Multipliers == nil {
		e.r.because(Doubtful, "there are no multipliers, so that optimality cannot be checked")
		return
	}
	e.dual(a)
	e.together(a, values)
}

// primal examines the point: cones, bounds, objective. It returns the values of all rows.
func (e *examiner) primal(a *model.Answer) [][]complex128 {
	x := entries(a.Point)
	e.r.Primal = 0
	values := make([][]complex128, len(e.m.Constraints))
	for k := range e.m.Constraints {
		c, res := &e.m.Constraints[k], &e.r.Constraints[k]
		v, terms := rows(c, x, false)
		scale := slices.Max(terms)
		values[k] = v
		if c.Cone.Kind == model.Range {
			res.Distance = fromLimits(v, c.Cone.Lower, c.Cone.Upper, c.RealRow)
		} else {
			res.Distance, res.SmallestEigenvalue = distance(c.Cone.Kind, c.Map.Field, v, false)
		}
		e.missed = max(e.missed, res.Distance)
		e.feasible(res.Distance/(1+scale), "%s: relative distance of its rows from the cone", constraintTitle(e.m, k))
		if a.Multipliers != nil {
			e.price += res.Distance * norm(a.Multipliers.Constraints[k], c.Weight)
		}
	}
	for b := range e.m.Blocks {
		blk, res, v := &e.m.Blocks[b], &e.r.Blocks[b], a.Point.Values[b]
		scale := 1 + norm(v, blk.Weight)
		res.Distance, res.SmallestEigenvalue = distance(blk.Cone, blk.Field, v, false)
		e.missed = max(e.missed, res.Distance)
		e.feasible(res.Distance/scale, "%s: relative distance from its cone", blockTitle(e.m, b))
		if blk.Bounds == nil {
			continue
		}
		res.BoundViolation = fromLimits(v, blk.Bounds.Lower, blk.Bounds.Upper, blk.RealEntry)
		e.missed = max(e.missed, res.BoundViolation)
		e.feasible(res.BoundViolation/scale, "%s: relative violation of its bounds", blockTitle(e.m, b))
		if a.Multipliers != nil {
			e.price += res.BoundViolation * norm(a.Multipliers.Bounds[b], blk.Weight)
		}
	}
	e.grown(largest(a.Point.Values), e.missed, numbersOf(e.m), "the point")
	e.r.Objective = objective(e.m, x)
	if e.claimed || !math.IsNaN(a.Objective) {
		e.r.judge(apart(a.Objective, e.r.Objective), secondary*e.tol, e.claimed, "relative difference of the claimed objective %.10g from the recomputed %.10g", a.Objective, e.r.Objective)
	}
	return values
}

func (e *examiner) feasible(relative float64, format, place string) {
	e.r.Primal = max(e.r.Primal, relative)
	e.r.judge(relative, e.tol, e.claimed, format, place)
}

func (e *examiner) dualFeasible(relative float64, format, place string) {
	e.r.Dual = max(e.r.Dual, relative)
	e.r.judge(relative, e.tol, e.claimed, format, place)
}

// apart is the relative difference of two values; NaN counts as far apart.
func apart(claim, found float64) float64 {
	d := math.Abs(claim-found) / (1 + math.Abs(found))
	if math.IsNaN(d) {
		return math.Inf(1)
	}
	return d
}

// dual examines the multipliers: dual cones and stationarity.
func (e *examiner) dual(a *model.Answer) {
	y := a.Multipliers
	e.r.Dual = 0
	for k := range e.m.Constraints {
		c, v := &e.m.Constraints[k], y.Constraints[k]
		far := multiplierDistance(c, v)
		e.r.Constraints[k].MultiplierDistance = far
		e.strayed = max(e.strayed, far)
		e.dualFeasible(far/(1+norm(v, c.Weight)), "%s: relative distance of its multiplier from the dual cone", constraintTitle(e.m, k))
	}
	left, terms := reduced(e.m, y, true)
	for b := range e.m.Blocks {
		blk := &e.m.Blocks[b]
		far, _ := distance(blk.Cone, blk.Field, left[b], true)
		if blk.Bounds != nil {
			far = math.Hypot(far, pushOnNothing(y.Bounds[b], blk.Bounds.Lower, blk.Bounds.Upper))
		}
		e.r.Blocks[b].Stationarity = far
		e.strayed = max(e.strayed, far)
		e.dualFeasible(far/(1+slices.Max(terms[b])), "%s: relative distance of its reduced cost from the dual cone", blockTitle(e.m, b))
		e.price += far * norm(a.Point.Values[b], blk.Weight)
	}
	cost := 1.0 // what multipliers answer to
	for _, c := range e.m.Objective.Coef {
		cost = max(cost, size(c))
	}
	e.grown(largest(y.Constraints), e.strayed, cost, "the multipliers")
}

// grown raises a flag when something is feasible by its size alone. own is the size of the model's numbers that it answers to.
func (e *examiner) grown(size, miss, own float64, what string) {
	if size > growth*own && size/own*(miss/own) > growthProduct {
		e.r.because(Doubtful, "%s has size %.2g and misses by %.2g: it lives by its growth, as where an optimum or a feasible point is not attained", what, size, miss)
	}
}

func largest(v [][]complex128) float64 {
	n := 0.0
	for _, x := range v {
		for _, y := range x {
			n = max(n, size(y))
		}
	}
	return n
}

// numbersOf is 1 + the largest constant, limit or bound of the model: what points answer to.
func numbersOf(m *model.Model) float64 {
	n := 0.0
	see := func(v []complex128) {
		for _, x := range v {
			for _, y := range []float64{real(x), imag(x)} {
				if !math.IsInf(y, 0) {
					n = max(n, math.Abs(y))
				}
			}
		}
	}
	for k := range m.Constraints {
		see(m.Constraints[k].Map.Const)
		see(m.Constraints[k].Cone.Lower)
		see(m.Constraints[k].Cone.Upper)
	}
	for b := range m.Blocks {
		if m.Blocks[b].Bounds != nil {
			see(m.Blocks[b].Bounds.Lower)
			see(m.Blocks[b].Bounds.Upper)
		}
	}
	return 1 + n
}

// multiplierDistance is how far a constraint's multiplier is from its dual cone.
func multiplierDistance(c *model.Constraint, y []complex128) float64 {
	if c.Cone.Kind == model.Range {
		return pushOnNothing(y, c.Cone.Lower, c.Cone.Upper)
	}
	far, _ := distance(c.Cone.Kind, c.Map.Field, y, true)
	return far
}

// together examines what point and multipliers say of each other: gap, complementarity, price.
func (e *examiner) together(a *model.Answer, values [][]complex128) {
	y := a.Multipliers
	sign := 1.0
	if e.m.Objective.Sense == model.Maximize {
		sign = -1
	}
	e.r.Bound = e.m.Objective.Const + sign*dualObjective(e.m, y)
	scale := 1 + math.Abs(e.r.Objective) + math.Abs(e.r.Bound)
	e.r.RelativeGap = math.Abs(e.r.Objective-e.r.Bound) / scale
	e.r.judge(e.r.RelativeGap, e.tol, e.claimed, "relative gap between objective %.10g and bound %.10g", e.r.Objective, e.r.Bound)
	e.r.Complementarity = 0
	for k, v := range values {
		c := &e.m.Constraints[k]
		var s sum
		for r := range v {
			s.add(c.Weight(r) * pairing(c, r, y.Constraints[k][r], v[r]))
		}
		res := &e.r.Constraints[k]
		res.Complementarity = math.Abs(s.value())
		e.r.Complementarity = max(e.r.Complementarity, res.Complementarity/scale)
		e.r.judge(res.Complementarity/scale, e.tol, e.claimed, "%s: relative complementarity", constraintTitle(e.m, k))
	}
	if !math.IsNaN(a.Bound) {
		e.r.judge(apart(a.Bound, e.r.Bound), secondary*e.tol, e.claimed, "relative difference of the claimed bound %.10g from the recomputed %.10g", a.Bound, e.r.Bound)
	}
	e.r.Price = e.price / (1 + math.Abs(e.r.Objective))
	if !(e.r.Price <= secondary*e.tol) {
		e.r.because(Doubtful, "violations could be worth %.2g of the objective, allowed %.2g: point or multipliers are too large to trust", e.r.Price, secondary*e.tol)
	}
}

// pairing is <y, v> for one row; for a range row the product with the distance from the side that y pushes on.
func pairing(c *model.Constraint, r int, y, v complex128) float64 {
	if c.Cone.Kind != model.Range {
		return real(y)*real(v) + imag(y)*imag(v)
	}
	t := 0.0
	if limit, ok := side(real(y), real(c.Cone.Lower[r]), real(c.Cone.Upper[r])); ok {
		t += real(y) * (real(v) - limit)
	}
	if limit, ok := side(imag(y), imag(c.Cone.Lower[r]), imag(c.Cone.Upper[r])); ok {
		t += imag(y) * (imag(v) - limit)
	}
	return t
}
