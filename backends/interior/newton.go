package interior

import "math"

// newton solves for directions at one iterate.
type newton struct {
	f *form
	s *state
	k *kkt
	// firm is the place in firmness that served last.
	firm int
	// response to one unit of tau
	x    []float64
	p, q [][]float64
	den  float64
}

// direction is a step in everything.
type direction struct {
	x          []float64
	p, q       [][]float64
	tau, kappa float64
}

// side is a right-hand side of the Newton system, or what an approximate solution leaves of one.
type side struct {
	x          []float64   // A dP + B du - b dtau;  c_u dtau - B'dy - F'dQ
	item       [][]float64 // blocks: c dtau - A'dy - dQ;  maps: F du + f dtau - dP
	pair       [][]float64 // dP + H dQ
	gap, kappa float64     // b'dy - c_u'du - c'dP - f'dQ - dkappa;  kappa dtau + tau dkappa
}

// prepare factors the reduced system, which has been formed at the state's scalings, and finds the response to tau.
func (v *newton) prepare(s *state) (ok bool) {
	f := v.f
	v.s = s
	if !v.k.factor(v.k.regularity, f.rows) {
		return false
	}
	g := make([]float64, f.rows+f.free)
	copy(g, f.b)
	copy(g[f.rows:], f.cu)
	for _, it := range f.items {
		h := make([]float64, it.dim())
		it.apply(h, it.offset, !it.isBlock)
		it.back(g, h, 1)
	}
	v.x = v.k.solve(g)
	v.p, v.q = nil, nil
	v.den = dot(f.b, v.x[:f.rows]) - dot(f.cu, v.x[f.rows:]) + s.kappa/s.tau
	for _, it := range f.items {
		p, q := make([]float64, it.dim()), make([]float64, it.dim())
		if it.isBlock { // dQ = c dtau - A'dy, dP = -H dQ
			copy(q, it.offset)
			it.forward(q, v.x, -1)
			it.apply(p, q, false)
			negate(p)
			v.den -= dot(it.offset, p)
		} else { // dP = F du + f dtau, dQ = -H^-1 dP
			copy(p, it.offset)
			it.forward(p, v.x, 1)
			it.apply(q, p, true)
			negate(q)
			v.den -= dot(it.offset, q)
		}
		v.p, v.q = append(v.p, p), append(v.q, q)
	}
	return true
}

// rounds bounds the refinement of the whole system.
const rounds = 12

// solve gives the direction that removes the fraction eta of the residuals. The whole system is refined, not only its
// reduced form: dQ = H^-1 (...) loses digits near the boundary that F'dQ then misses, and the regularisation of the reduced
// system leaves weak directions short. Generalized conjugate residuals, with the factored system as preconditioner
// (Eisenstat, Elman and Schultz 1983, from memory): what is left never grows, and its size is returned too.
func (v *newton) solve(r *residuals, eta float64, pair [][]float64, kappa float64) (d *direction, short float64) {
	e := &side{x: scaled(r.x, -eta), pair: pair, gap: -eta * r.gap, kappa: kappa}
	for _, t := range r.item {
		e.item = append(e.item, scaled(t, -eta))
	}
	d = v.once(e)
	left := v.left(e, d)
	goal := 1e-16 * (1 + e.size())
	var steps []*direction
	var effects []*side
	for range rounds {
		before := left.size()
		if before <= goal || math.IsNaN(before) || math.IsInf(before, 0) {
			break
		}
		step := v.once(left)
		effect := v.left(left, step)
		effect.times(-1)
		effect.add(1, left)
		for range 2 { // once is not enough when steps are nearly dependent
			for i := range steps {
				b := effect.dot(effects[i])
				step.add(-b, steps[i])
				effect.add(-b, effects[i])
			}
		}
		n := effect.size()
		if !(n > 0) || math.IsInf(n, 0) {
			break
		}
		step.times(1 / n)
		effect.times(1 / n)
		a := left.dot(effect)
		d.add(a, step)
		left.add(-a, effect)
		steps, effects = append(steps, step), append(effects, effect)
		if !(left.size() < 0.9*before) {
			break
		}
	}
	return d, left.size()
}

func scaled(x []float64, f float64) []float64 {
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = f * v
	}
	return out
}

// size measures what is left of the linear equations; pairs are left out, their rows are of very different sizes.
func (e *side) size() float64 {
	n := math.Hypot(norm(e.x), e.gap)
	for _, t := range e.item {
		n = math.Hypot(n, norm(t))
	}
	return n
}

// dot is the inner product that goes with size.
func (e *side) dot(o *side) float64 {
	t := dot(e.x, o.x) + e.gap*o.gap
	for i := range e.item {
		t += dot(e.item[i], o.item[i])
	}
	return t
}

// add adds a o to e.
func (e *side) add(a float64, o *side) {
	axpyReal(e.x, a, o.x)
	e.gap += a * o.gap
	e.kappa += a * o.kappa
	for i := range e.item {
		axpyReal(e.item[i], a, o.item[i])
		axpyReal(e.pair[i], a, o.pair[i])
	}
}

func (e *side) times(a float64) {
	scale(e.x, a)
	e.gap *= a
	e.kappa *= a
	for i := range e.item {
		scale(e.item[i], a)
		scale(e.pair[i], a)
	}
}

// add adds a c to the direction.
func (d *direction) add(a float64, c *direction) {
	axpyReal(d.x, a, c.x)
	d.tau += a * c.tau
	d.kappa += a * c.kappa
	for i := range d.p {
		axpyReal(d.p[i], a, c.p[i])
		axpyReal(d.q[i], a, c.q[i])
	}
}

func (d *direction) times(a float64) {
	scale(d.x, a)
	d.tau *= a
	d.kappa *= a
	for i := range d.p {
		scale(d.p[i], a)
		scale(d.q[i], a)
	}
}

// axpyReal adds a x to y.
func axpyReal(y []float64, a float64, x []float64) {
	for i, v := range x {
		y[i] += a * v
	}
}

func scale(x []float64, a float64) {
	for i := range x {
		x[i] *= a
	}
}

// left returns the right-hand side minus what the direction achieves.
func (v *newton) left(e *side, d *direction) *side {
	f := v.f
	n := f.rows
	l := &side{x: append([]float64(nil), e.x...), gap: e.gap, kappa: e.kappa - v.s.kappa*d.tau - v.s.tau*d.kappa}
	y, u := d.x[:n], d.x[n:]
	for k := range f.bu {
		l.x[k] += f.b[k]*d.tau - f.bu[k].dot(u)
		f.bu[k].addTo(l.x[n:], y[k])
	}
	for k := range f.cu {
		l.x[n+k] -= f.cu[k] * d.tau
	}
	l.gap -= dot(f.b, y) - dot(f.cu, u) - d.kappa
	for i, it := range f.items {
		t, h := append([]float64(nil), e.item[i]...), make([]float64, it.dim())
		other, priced := d.q[i], d.p[i]
		if it.isBlock {
			it.back(l.x, d.p[i], -1)
			it.forward(t, d.x, 1)
		} else {
			it.back(l.x, d.q[i], 1)
			it.forward(t, d.x, -1)
			other, priced = d.p[i], d.q[i]
		}
		l.gap += dot(it.offset, priced)
		it.apply(h, d.q[i], false)
		for k := range t {
			t[k] += other[k] - it.offset[k]*d.tau
			h[k] = e.pair[i][k] - d.p[i][k] - h[k]
		}
		l.item, l.pair = append(l.item, t), append(l.pair, h)
	}
	return l
}

// once solves the Newton system by elimination down to the reduced unknowns.
func (v *newton) once(e *side) *direction {
	f, s := v.f, v.s
	d := &direction{}
	g := append([]float64(nil), e.x...)
	negate(g[f.rows:])
	for i, it := range f.items {
		t, h := append([]float64(nil), e.item[i]...), make([]float64, it.dim())
		if it.isBlock { // -A (pair + H item)
			it.apply(h, t, false)
			for k := range h {
				h[k] += e.pair[i][k]
			}
		} else { // -F' H^-1 (pair + item)
			for k := range t {
				t[k] += e.pair[i][k]
			}
			it.apply(h, t, true)
		}
		it.back(g, h, -1)
	}
	d.x = v.k.solve(g)
	num := e.gap + e.kappa/s.tau - dot(f.b, d.x[:f.rows]) + dot(f.cu, d.x[f.rows:])
	for i, it := range f.items {
		p, q := make([]float64, it.dim()), make([]float64, it.dim())
		if it.isBlock {
			it.forward(q, d.x, -1)
			for k := range q {
				q[k] -= e.item[i][k]
			}
			it.apply(p, q, false)
			for k := range p {
				p[k] = e.pair[i][k] - p[k]
			}
			num += dot(it.offset, p)
		} else {
			it.forward(p, d.x, 1)
			t := make([]float64, it.dim())
			for k := range t {
				p[k] -= e.item[i][k]
				t[k] = e.pair[i][k] - p[k]
			}
			it.apply(q, t, true)
			num += dot(it.offset, q)
		}
		d.p, d.q = append(d.p, p), append(d.q, q)
	}
	d.tau = num / v.den
	d.kappa = (e.kappa - s.kappa*d.tau) / s.tau
	for i := range d.x {
		d.x[i] += d.tau * v.x[i]
	}
	for i := range d.p {
		for k := range d.p[i] {
			d.p[i][k] += d.tau * v.p[i][k]
			d.q[i][k] += d.tau * v.q[i][k]
		}
	}
	return d
}
