package check

import (
	"math"

	"towpath/model"
)

// infeasible examines a certificate of infeasibility.
func (e *examiner) infeasible(y *model.Multipliers) {
	if y == nil {
		e.r.because(Doubtful, "infeasibility is claimed without a certificate")
		return
	}
	value := dualObjective(e.m, y)
	if !(value > 0) {
		e.r.because(Refuted, "the certificate's value is %.2g, not positive", value)
		return
	}
	residue, total := 0.0, 0.0
	left, _ := reduced(e.m, y, false)
	for b := range e.m.Blocks {
		blk := &e.m.Blocks[b]
		far, _ := distance(blk.Cone, blk.Field, left[b], true)
		residue = math.Hypot(residue, far)
		if blk.Bounds != nil {
			residue = math.Hypot(residue, pushOnNothing(y.Bounds[b], blk.Bounds.Lower, blk.Bounds.Upper))
			total = math.Hypot(total, norm(y.Bounds[b], blk.Weight))
		}
	}
	for k := range e.m.Constraints {
		c := &e.m.Constraints[k]
		residue = math.Hypot(residue, multiplierDistance(c, y.Constraints[k]))
		total = math.Hypot(total, norm(y.Constraints[k], c.Weight))
	}
	e.certificate(residue/value, total/value)
}

// unbounded examines a ray.
func (e *examiner) unbounded(a *model.Answer) {
	if a.Ray == nil {
		e.r.because(Doubtful, "unboundedness is claimed without a ray")
		return
	}
	x := entries(a.Ray)
	gain := e.m.Objective.Const - objective(e.m, x)
	if e.m.Objective.Sense == model.Maximize {
		gain = -gain
	}
	if !(gain > 0) {
		e.r.because(Refuted, "the objective does not improve along the ray: it changes by %.2g", -gain)
		return
	}
	residue, total := 0.0, 0.0
	for k := range e.m.Constraints {
		c := &e.m.Constraints[k]
		v, _ := rows(c, x, true)
		var far float64
		if c.Cone.Kind == model.Range {
			far = fromLimits(v, recession(c.Cone.Lower), recession(c.Cone.Upper), c.RealRow)
		} else {
			far, _ = distance(c.Cone.Kind, c.Map.Field, v, false)
		}
		residue = math.Hypot(residue, far)
	}
	for b := range e.m.Blocks {
		blk, v := &e.m.Blocks[b], a.Ray.Values[b]
		far, _ := distance(blk.Cone, blk.Field, v, false)
		residue = math.Hypot(residue, far)
		if blk.Bounds != nil {
			residue = math.Hypot(residue, fromLimits(v, recession(blk.Bounds.Lower), recession(blk.Bounds.Upper), blk.RealEntry))
		}
		total = math.Hypot(total, norm(v, blk.Weight))
	}
	e.certificate(residue/gain, total/gain)
	e.r.Reasons = append(e.r.Reasons, "a ray shows that the model is unbounded if it is feasible; whether it is, was not examined")
}

// certificate judges a certificate scaled to value 1 by its residue and its size (see the package comment).
func (e *examiner) certificate(residue, total float64) {
	e.r.CertificateResidue, e.r.CertificateSize = residue, total
	e.r.judge(residue, e.tol, true, "residual of the certificate, scaled to value 1,")
	if !(residue*total <= certificateProduct) || !(total <= certificateSize) {
		e.r.because(Doubtful, "the certificate, scaled to value 1, has size %.2g and residual %.2g: it lives by its growth, as for a weakly infeasible model", total, residue)
	}
}

// recession turns limits into those of the directions that never leave them: finite ones become zero.
func recession(v []complex128) []complex128 {
	part := func(x float64) float64 {
		if math.IsInf(x, 0) {
			return x
		}
		return 0
	}
	out := make([]complex128, len(v))
	for k, x := range v {
		out[k] = complex(part(real(x)), part(imag(x)))
	}
	return out
}
