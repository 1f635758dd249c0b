package glpk

import (
	"math"

	"towpath/model"
)

// elastic is the program of least violation: every row may be left by a nonnegative amount at cost 1 and nothing else costs.
// It has a solution. Where its value is positive, the rows have no common point, and its multipliers, whose combination of
// the columns vanishes and whose dual objective is that value, are the certificate (Farkas's lemma; A. Schrijver, Theory of
// Linear and Integer Programming, 1986, section 7.3, from memory).
func (p *program) elastic() *program {
	e := *p
	n := len(p.cost)
	e.cost = make([]float64, n)
	e.lower, e.upper = append([]float64(nil), p.lower...), append([]float64(nil), p.upper...)
	e.start, e.column, e.value, e.constant = []int{0}, nil, nil, 0
	for r := range p.rowLower {
		e.column = append(e.column, p.column[p.start[r]:p.start[r+1]]...)
		e.value = append(e.value, p.value[p.start[r]:p.start[r+1]]...)
		give := func(amount float64) {
			e.column, e.value = append(e.column, uint32(len(e.cost))), append(e.value, amount)
			e.cost, e.lower, e.upper = append(e.cost, 1), append(e.lower, 0), append(e.upper, math.Inf(1))
		}
		if !math.IsInf(p.rowLower[r], -1) {
			give(1)
		}
		if !math.IsInf(p.rowUpper[r], 1) {
			give(-1)
		}
		e.start = append(e.start, len(e.column))
	}
	return &e
}

// farkas takes the certificate from a solution of the elastic program, at value 1, and returns its error: the reduced costs
// that push against a limit that is not there. +Inf means that there is no certificate.
func (p *program) farkas(s *solution, a *model.Answer) (off float64) {
	columns := s.columnDuals[:len(p.cost)]
	value := pushes(s.rowDuals, p.rowLower, p.rowUpper) + pushes(columns, p.lower, p.upper)
	if !(value > 0) || math.IsInf(value, 0) {
		return math.Inf(1)
	}
	terms := make([]float64, len(columns))
	for r, y := range s.rowDuals {
		for q := p.start[r]; q < p.start[r+1]; q++ {
			terms[p.column[q]] += math.Abs(y * p.value[q])
		}
	}
	for k, d := range columns {
		if d > 0 && math.IsInf(p.lower[k], -1) || d < 0 && math.IsInf(p.upper[k], 1) {
			off = max(off, math.Abs(d)/value)
			if share := math.Abs(d) / terms[k]; share > 1e-4 { // nothing cancels: a rounding error of the duals themselves
				off = max(off, share)
			}
		}
	}
	a.Outcome = model.Infeasible
	a.Farkas = p.multipliers(scaled(s.rowDuals, 1/value), scaled(columns, 1/value))
	return off
}

// recession is the program of rays: the homogeneous rows and bounds, and the cost of the ray no less than -1. Zero is
// feasible and the value is bounded; where it is -1 the solution is a ray of falling cost.
func (p *program) recession() *program {
	e := *p
	e.constant = 0
	e.lower, e.upper = receding(p.lower, p.upper)
	e.rowLower, e.rowUpper = receding(p.rowLower, p.rowUpper)
	e.rowLower, e.rowUpper = append(e.rowLower, -1), append(e.rowUpper, math.Inf(1))
	e.start = append([]int(nil), p.start...)
	e.column, e.value = append([]uint32(nil), p.column...), append([]float64(nil), p.value...)
	for j, c := range p.cost {
		if c != 0 {
			e.column, e.value = append(e.column, uint32(j)), append(e.value, c)
		}
	}
	e.start = append(e.start, len(e.column))
	return &e
}

// receding replaces finite limits by zero.
func receding(lower, upper []float64) (lo, up []float64) {
	for k := range lower {
		l, u := 0.0, 0.0
		if math.IsInf(lower[k], -1) {
			l = lower[k]
		}
		if math.IsInf(upper[k], 1) {
			u = upper[k]
		}
		lo, up = append(lo, l), append(up, u)
	}
	return lo, up
}

// ray takes the certificate from a solution of the recession program, at cost -1. Columns are values, not duals, and need no
// more digits: the error is 0, or +Inf when there is no ray.
func (p *program) ray(s *solution, a *model.Answer) (off float64) {
	cost := 0.0
	for j, c := range p.cost {
		cost += c * s.columns[j]
	}
	if !(cost < -0.5) { // -1 but for rounding, or 0 when there is no ray
		return math.Inf(1)
	}
	a.Outcome = model.Unbounded
	a.Ray = p.point(scaled(s.columns, -1/cost))
	return 0
}

func scaled(v []float64, by float64) []float64 {
	out := make([]float64, len(v))
	for k, x := range v {
		out[k] = by * x
	}
	return out
}
