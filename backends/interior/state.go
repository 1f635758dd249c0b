package interior

import "math"

// state is one iterate of the homogeneous self-dual embedding: with y and u the reduced unknowns, P and Q the primal and
// dual variable of every cone,
//
//	A X + B u - b tau                     = 0
//	c_u tau - B' y - sum F' Z             = 0
//	c_X tau - A' y - S_X                  = 0   blocks: P = X, Q = S_X
//	F u + f tau - S                       = 0   maps:   P = S, Q = Z
//	b' y - c_u' u - <c_X, X> - <f, Z> - kappa = 0
//
// (Ye, Todd and Mizuno 1994; Xu, Hung and Ye 1996; from memory.)
type state struct {
	x          []float64 // y, then u
	p, q       [][]float64
	tau, kappa float64
}

func (f *form) initial() *state {
	s := &state{x: make([]float64, f.rows+f.free), tau: 1, kappa: 1}
	for _, it := range f.items {
		p, q := make([]float64, it.dim()), make([]float64, it.dim())
		it.unit(p)
		it.unit(q)
		s.p, s.q = append(s.p, p), append(s.q, q)
	}
	return s
}

func (s *state) clone() *state {
	c := &state{x: append([]float64(nil), s.x...), tau: s.tau, kappa: s.kappa}
	for i := range s.p {
		c.p = append(c.p, append([]float64(nil), s.p[i]...))
		c.q = append(c.q, append([]float64(nil), s.q[i]...))
	}
	return c
}

// times multiplies everything: the embedding is homogeneous.
func (s *state) times(f float64) {
	scale := func(x []float64) {
		for i := range x {
			x[i] *= f
		}
	}
	scale(s.x)
	for i := range s.p {
		scale(s.p[i])
		scale(s.q[i])
	}
	s.tau *= f
	s.kappa *= f
}

func (s *state) move(d *direction, alpha float64) {
	add := func(x, dx []float64) {
		for i := range x {
			x[i] += alpha * dx[i]
		}
	}
	add(s.x, d.x)
	for i := range s.p {
		add(s.p[i], d.p[i])
		add(s.q[i], d.q[i])
	}
	s.tau += alpha * d.tau
	s.kappa += alpha * d.kappa
}

// mu is the mean complementarity.
func (f *form) mu(s *state) float64 {
	t, n := s.tau*s.kappa, 1.0
	for i, it := range f.items {
		t += dot(s.p[i], s.q[i])
		n += it.degree()
	}
	return t / n
}

// residuals are the left-hand sides of the embedding, and what termination needs of them.
type residuals struct {
	x      []float64   // rows, then columns
	item   [][]float64 // blocks, maps
	gap    float64
	rays   []float64   // x without its tau terms
	rayOf  [][]float64 // item without its tau terms
	cx, by float64     // primal and dual objective, times tau
}

// size measures the residuals as a whole.
func (r *residuals) size() float64 {
	n := math.Hypot(norm(r.x), r.gap)
	for _, t := range r.item {
		n = math.Hypot(n, norm(t))
	}
	return n
}

func (f *form) residuals(s *state) *residuals {
	n := f.rows
	r := &residuals{rays: make([]float64, n+f.free)}
	y, u := s.x[:n], s.x[n:]
	for k := range f.bu {
		r.rays[k] += f.bu[k].dot(u)
		f.bu[k].addTo(r.rays[n:], -y[k])
	}
	r.cx, r.by = dot(f.cu, u), dot(f.b, y)
	for i, it := range f.items {
		v := make([]float64, it.dim())
		other := s.q[i]
		if it.isBlock {
			it.back(r.rays, s.p[i], 1)
			it.forward(v, s.x, -1)
			r.cx += dot(it.offset, s.p[i])
		} else {
			it.back(r.rays, s.q[i], -1)
			it.forward(v, s.x, 1)
			other = s.p[i]
			r.by -= dot(it.offset, s.q[i])
		}
		with := make([]float64, len(v))
		for k := range v {
			v[k] -= other[k]
			with[k] = v[k] + it.offset[k]*s.tau
		}
		r.rayOf, r.item = append(r.rayOf, v), append(r.item, with)
	}
	r.x = append([]float64(nil), r.rays...)
	for k := range f.b {
		r.x[k] -= f.b[k] * s.tau
	}
	for k := range f.cu {
		r.x[n+k] += f.cu[k] * s.tau
	}
	r.gap = r.by - r.cx - s.kappa
	return r
}

// measure says how far an iterate is from each of the three ends.
type measure struct {
	primal, dual, gap      float64 // relative residuals of (x, y)/tau
	primalValue, dualValue float64
	infeasible, unbounded  float64 // residuals of y, of x, scaled to certificate value 1; +Inf when they have the wrong sign
	ySize, xSize           float64 // sizes of those certificates
}

func (m measure) worst() float64 { return max(m.primal, m.dual, m.gap) }

func (f *form) measure(s *state, r *residuals) measure {
	n := f.rows
	hyp := func(a float64, v []float64) float64 { return math.Hypot(a, norm(v)) }
	primal, dual := norm(r.x[:n]), norm(r.x[n:])
	ray, far := norm(r.rays[:n]), norm(r.rays[n:])
	b, c := norm(f.b), norm(f.cu)
	xSize, ySize := norm(s.x[n:]), norm(s.x[:n])
	for i, it := range f.items {
		if it.isBlock {
			dual, far, c = hyp(dual, r.item[i]), hyp(far, r.rayOf[i]), hyp(c, it.offset)
			xSize = hyp(xSize, s.p[i])
		} else {
			primal, ray, b = hyp(primal, r.item[i]), hyp(ray, r.rayOf[i]), hyp(b, it.offset)
			ySize = hyp(ySize, s.q[i])
		}
	}
	m := measure{
		primal: primal / s.tau / (1 + b), dual: dual / s.tau / (1 + c),
		primalValue: r.cx / s.tau, dualValue: r.by / s.tau,
		infeasible: math.Inf(1), unbounded: math.Inf(1),
	}
	m.gap = math.Abs(m.primalValue-m.dualValue) / (1 + math.Abs(m.primalValue) + math.Abs(m.dualValue))
	if r.by > 0 {
		m.infeasible, m.ySize = far/r.by, ySize/r.by
	}
	if r.cx < 0 {
		m.unbounded, m.xSize = ray/-r.cx, xSize/-r.cx
	}
	return m
}
