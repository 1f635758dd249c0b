package bridgetest

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"testing"

	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

const (
	// wanted is on how many random models a law is tried, and searched how many are looked through for them.
	wanted   = 12
	searched = 3000
	rounding = 1e-10 // of sums of a few dozen numbers of size one
)

// Run holds every bridge of a catalogue to the laws. Without an engine the law of execution is left out.
func Run(t *testing.T, catalogue []bridges.Bridge, engine *Engine) {
	for _, b := range catalogue {
		t.Run(b.ID(), func(t *testing.T) {
			if b.Source() == "" {
				t.Error("it has no source")
			}
			for _, err := range Broken(Subject{Bridge: b, Engine: engine}) {
				t.Error(err)
			}
		})
	}
}

// Broken lists the laws that the subject breaks, at most one line for each.
func Broken(s Subject) []error {
	var out []error
	for _, l := range []struct {
		name string
		law  func(*Subject) error
	}{{"sizes", sizes}, {"algebra", algebra}, {"membership", membership}, {"execution", execution}} {
		if err := l.law(&s); err != nil {
			out = append(out, fmt.Errorf("%s: %w", l.name, err))
		}
	}
	return out
}

// sizes: rules yield parts that exist, and never shrink as sizes grow.
func sizes(s *Subject) error {
	last := 0
	for n := 1; n <= 12; n++ {
		parts, ok := s.Yields(n)
		if !ok {
			continue
		}
		total := 0
		for _, p := range parts {
			if p.Size < 1 || p.Count < 1 || p.Kind.Separable() && p.Size != 1 {
				return fmt.Errorf("size %d yields %v", n, p)
			}
			total += p.Size * p.Count
		}
		if total < last {
			return fmt.Errorf("size %d yields less than a smaller one", n)
		}
		last = total
	}
	if last == 0 {
		return fmt.Errorf("no size up to 12 is taken")
	}
	return nil
}

// eachModel visits random models of an outcome that have a route, until enough of them were seen.
func eachModel(outcome model.Outcome, route func(*model.Model) (*capability.Route, bool), visit func(modeltest.Recipe, *model.Model, *model.Answer, *capability.Route) error) error {
	seen := 0
	for seed := range uint64(searched) {
		r := modeltest.Recipe{Seed: seed, Outcome: outcome}
		m, known := r.Make()
		way, ok := route(m)
		if !ok {
			continue
		}
		if err := visit(r, m, known, way); err != nil {
			return fmt.Errorf("%s: %w", r, err)
		}
		if seen++; seen == wanted {
			return nil
		}
	}
	if seen == 0 {
		return fmt.Errorf("none of %d random models goes over it", searched)
	}
	return nil
}

// algebra: sizes, purity, substitution, adjoint.
func algebra(s *Subject) error {
	rng := rand.New(rand.NewPCG(3, 4))
	return eachModel(model.Optimal, s.single, func(_ modeltest.Recipe, m *model.Model, _ *model.Answer, route *capability.Route) error {
		before := modeltest.Copy(m)
		x, err := s.cross(m, route)
		if err != nil {
			return err
		}
		again, err := s.cross(m, route)
		if err != nil {
			return err
		}
		if !reflect.DeepEqual(m, before) {
			return fmt.Errorf("the client's model was changed")
		}
		if !reflect.DeepEqual(again.lowered, x.lowered) {
			return fmt.Errorf("lowering twice gives two models")
		}
		far := randomPoint(rng, x.lowered)
		if err := substitution(s, m, x, far); err != nil {
			return err
		}
		if s.From().Place == capability.OnBlock {
			return nil
		}
		return adjoint(rng, m, x)
	})
}

// substitution compares objective and untouched constraints at a point and at what it is lifted to.
func substitution(s *Subject, m *model.Model, x crossing, far *model.Point) error {
	near := x.lift(&model.Answer{Point: far}).Point
	sign := 1.0
	if m.Objective.Sense == model.Maximize {
		sign = -1
	}
	if a, b := sign*m.ObjectiveAt(near), x.lowered.ObjectiveAt(far); !close(a, b) {
		return fmt.Errorf("substitution: the objective is %.12g there and %.12g here", b, a)
	}
	// Untouched constraints keep their order and come first among those of the lowered model.
	at := 0
	for k := range m.Constraints {
		if kind, _, _ := capability.MeasureMap(&m.Constraints[k]); kind == s.From() {
			continue
		}
		for x.lowered.Constraints[at].Name != m.Constraints[k].Name {
			at++
		}
		here, there := m.RowsAt(k, near), x.lowered.RowsAt(at, far)
		for r := range here {
			if !close(real(here[r]), real(there[r])) || !close(imag(here[r]), imag(there[r])) {
				return fmt.Errorf("substitution: row %d of constraint %d is %v there and %v here", r, k, there[r], here[r])
			}
		}
	}
	return nil
}

// adjoint pairs random multipliers with the linear parts of all maps and bounds, at points where new entries are zero.
func adjoint(rng *rand.Rand, m *model.Model, x crossing) error {
	far, origin := randomPoint(rng, x.lowered), &model.Point{}
	for b := range far.Values {
		origin.Values = append(origin.Values, make([]complex128, len(far.Values[b])))
		if b >= len(m.Blocks) {
			clear(far.Values[b])
		}
	}
	near := x.lift(&model.Answer{Point: far}).Point
	y := randomMultipliers(rng, x.lowered)
	lifted := x.lift(&model.Answer{Multipliers: y}).Multipliers
	there := pairing(x.lowered, y, far, origin)
	here := pairing(m, lifted, near, &model.Point{Values: origin.Values[:len(m.Blocks)]})
	if !close(there, here) {
		return fmt.Errorf("adjoint: multipliers pair to %.12g there and to %.12g here", there, here)
	}
	return nil
}

// pairing is sum <y, F(x) - F(0)> + sum <z, x>.
func pairing(m *model.Model, y *model.Multipliers, x, origin *model.Point) float64 {
	sum := 0.0
	for k := range m.Constraints {
		c := &m.Constraints[k]
		f, f0 := m.RowsAt(k, x), m.RowsAt(k, origin)
		for r := range f {
			sum += c.Weight(r) * dot(y.Constraints[k][r], f[r]-f0[r])
		}
	}
	for b := range m.Blocks {
		for k, z := range y.Bounds[b] {
			sum += m.Blocks[b].Weight(k) * dot(z, x.Values[b][k])
		}
	}
	return sum
}

// membership tries, one item at a time, whether the images hold at a point just when the original does: at points that
// satisfy the model and at others.
func membership(s *Subject) error {
	if s.From().Place == capability.OnBlock {
		return nil
	}
	rng := rand.New(rand.NewPCG(7, 9))
	inside, outside := 0, 0
	err := eachModel(model.Optimal, s.single, func(_ modeltest.Recipe, m *model.Model, known *model.Answer, _ *capability.Route) error {
		for _, one := range alone(m, s.From()) {
			route, _ := s.single(one)
			x, err := s.cross(one, route)
			if err != nil {
				return err
			}
			if len(x.lowered.Blocks) > len(one.Blocks) {
				return nil
			}
			for try := range 8 {
				p := known.Point
				if try > 0 {
					p = near(rng, p, math.Pow(10, -float64(try%4)))
				}
				here, there := violation(one, p), violation(x.lowered, p)
				const clear = 1e-5
				if here <= rounding && there > clear || here > clear && there <= rounding {
					return fmt.Errorf("%v violates the original by %.3g and its images by %.3g", p.Values, here, there)
				}
				if here <= rounding {
					inside++
				} else {
					outside++
				}
			}
		}
		return nil
	})
	if err == nil && (inside > 0) != (outside > 0) {
		err = fmt.Errorf("%d points inside, %d outside: the law was not tried", inside, outside)
	}
	return err
}

// alone gives, for every item of the kind, the model with nothing else in it.
func alone(m *model.Model, kind capability.Kind) []*model.Model {
	bare := func() *model.Model {
		out := &model.Model{}
		for _, b := range m.Blocks {
			b.Bounds, b.Cone = nil, model.Free
			out.Blocks = append(out.Blocks, b)
		}
		return out
	}
	var out []*model.Model
	for k := range m.Constraints {
		if is, _, _ := capability.MeasureMap(&m.Constraints[k]); is == kind {
			one := bare()
			one.Constraints = m.Constraints[k : k+1]
			out = append(out, one)
		}
	}
	for b := range m.Blocks {
		if m.Blocks[b].Bounds == nil {
			continue
		}
		if is, _ := capability.MeasureBounds(&m.Blocks[b]); is == kind {
			one := bare()
			one.Blocks[b].Bounds = m.Blocks[b].Bounds
			out = append(out, one)
		}
	}
	return out
}

// violation is the largest distance of anything in the model from where it belongs.
func violation(m *model.Model, p *model.Point) float64 {
	r := check.Examine(m, &model.Answer{Outcome: model.Inaccurate, Point: p, Objective: math.NaN(), Bound: math.NaN()}, check.Tolerances{})
	worst := 0.0
	for _, c := range r.Constraints {
		worst = max(worst, c.Distance)
	}
	for _, b := range r.Blocks {
		if !math.IsNaN(b.BoundViolation) { // it has bounds
			worst = max(worst, b.BoundViolation)
		}
	}
	return worst
}
