package check

import (
	"math"
	"slices"

	"towpath/model"
)

// infeasible examines a certificate of infeasibility.
func (e *examiner) infeasible(y *model.Multipliers) {
	if y == nil {
		e.r.because(Doubtful, "infeasibility is claimed without a certificate")
		return
	}
	p := e.contradiction(y)
	if !(p.value > 0) {
		e.r.because(Refuted, "the certificate's value is %.2g, not positive", p.value)
		return
	}
	if p.bare > uncancelled {
		if swept := e.contradiction(sweptMultipliers(e.m, y)); swept.better(p) {
			p = swept
		}
	}
	e.certificate(p)
}

// proof is what a certificate comes to.
type proof struct {
	value   float64 // to which the others are scaled in the end
	residue float64
	size    float64
	bare    float64 // largest residual of an entry (row) relative to its own terms
	where   string  // it is
}

// better says that a certificate without its smallest numbers proves more.
func (p proof) better(than proof) bool { return p.value > 0 && p.bare < than.bare }

// see adds a residual: how far something is from zero or from a cone, against its own terms.
func (p *proof) see(far, terms float64, where string) {
	p.residue = math.Hypot(p.residue, far)
	if far > 0 && !(far <= p.bare*terms) {
		p.bare, p.where = far/terms, where
	}
}

// contradiction measures multipliers as a certificate of infeasibility.
func (e *examiner) contradiction(y *model.Multipliers) proof {
	p := proof{value: dualObjective(e.m, y)}
	left, terms := reduced(e.m, y, false)
	for b := range e.m.Blocks {
		blk := &e.m.Blocks[b]
		name := blockTitle(e.m, b)
		if splits(blk.Cone) {
			for k := range left[b] { // entries stand for themselves
				far, _ := distance(blk.Cone, model.Complex, left[b][k:k+1], true)
				p.see(far*math.Sqrt(blk.Weight(k)), terms[b][k], name)
			}
		} else {
			far, _ := distance(blk.Cone, blk.Field, left[b], true)
			p.see(far, slices.Max(terms[b]), name)
		}
		if blk.Bounds != nil {
			size := norm(y.Bounds[b], blk.Weight)
			p.see(pushOnNothing(y.Bounds[b], blk.Bounds.Lower, blk.Bounds.Upper), size, name)
			p.size = math.Hypot(p.size, size)
		}
	}
	for k := range e.m.Constraints {
		c := &e.m.Constraints[k]
		size := norm(y.Constraints[k], c.Weight)
		p.see(multiplierDistance(c, y.Constraints[k]), size, constraintTitle(e.m, k))
		p.size = math.Hypot(p.size, size)
	}
	return p
}

// unbounded examines a ray.
func (e *examiner) unbounded(a *model.Answer) {
	if a.Ray == nil {
		e.r.because(Doubtful, "unboundedness is claimed without a ray")
		return
	}
	p := e.improvement(a.Ray)
	if !(p.value > 0) {
		e.r.because(Refuted, "the objective does not improve along the ray: it changes by %.2g", -p.value)
		return
	}
	if p.bare > uncancelled {
		if swept := e.improvement(sweptPoint(e.m, a.Ray)); swept.better(p) {
			p = swept
		}
	}
	e.certificate(p)
	e.r.Reasons = append(e.r.Reasons, "a ray shows that the model is unbounded if it is feasible; whether it is, was not examined")
}

// improvement measures a direction as a certificate of unboundedness.
func (e *examiner) improvement(ray *model.Point) proof {
	x := entries(ray)
	p := proof{value: e.m.Objective.Const - objective(e.m, x)}
	if e.m.Objective.Sense == model.Maximize {
		p.value = -p.value
	}
	for k := range e.m.Constraints {
		c := &e.m.Constraints[k]
		name := constraintTitle(e.m, k)
		v, terms := rows(c, x, true)
		switch c.Cone.Kind {
		case model.Range:
			lower, upper := recession(c.Cone.Lower), recession(c.Cone.Upper)
			for r := range v {
				real0 := func(int) bool { return c.RealRow(r) }
				p.see(fromLimits(v[r:r+1], lower[r:r+1], upper[r:r+1], real0), terms[r], name)
			}
		case model.Zero, model.Nonneg: // rows stand for themselves
			for r := range v {
				far, _ := distance(c.Cone.Kind, model.Complex, v[r:r+1], false)
				p.see(far*math.Sqrt(c.Weight(r)), terms[r], name)
			}
		default:
			far, _ := distance(c.Cone.Kind, c.Map.Field, v, false)
			p.see(far, slices.Max(terms), name)
		}
	}
	for b := range e.m.Blocks {
		blk, v := &e.m.Blocks[b], ray.Values[b]
		name, size := blockTitle(e.m, b), norm(v, blk.Weight)
		far, _ := distance(blk.Cone, blk.Field, v, false)
		p.see(far, size, name)
		if blk.Bounds != nil {
			p.see(fromLimits(v, recession(blk.Bounds.Lower), recession(blk.Bounds.Upper), blk.RealEntry), size, name)
		}
		p.size = math.Hypot(p.size, size)
	}
	return p
}

// certificate judges a certificate scaled to value 1 by its residue, its size, and whether its residuals are what is left of
// larger terms (see the package comment).
func (e *examiner) certificate(p proof) {
	residue, size := p.residue/p.value, p.size/p.value
	e.r.CertificateResidue, e.r.CertificateSize = residue, size
	e.r.judge(residue, e.tol, true, "residual of the certificate, scaled to value 1,")
	if !(p.bare <= uncancelled) {
		e.r.because(Doubtful, "%s: the residual of the certificate is %.2g of the terms it is made of: nothing cancels there", p.where, p.bare)
	}
	if !(residue*size <= certificateProduct) || !(size <= certificateSize) {
		e.r.because(Doubtful, "the certificate, scaled to value 1, has size %.2g and residual %.2g: it lives by its growth, as for a weakly infeasible model", size, residue)
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
