package bridgetest

import (
	"fmt"
	"math"

	"towpath/capability"
	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

// execution solves models with known answers on the far side and examines what is lifted. The engine is not perfect: a
// model on which it gives up says nothing of the bridge, but few may.
func execution(s *Subject) error {
	if s.Engine == nil {
		return nil
	}
	for _, outcome := range []model.Outcome{model.Optimal, model.Infeasible, model.Unbounded} {
		tried, gaveUp := 0, 0
		err := eachModel(outcome, s.forced, func(_ modeltest.Recipe, m *model.Model, known *model.Answer, route *capability.Route) error {
			x, err := s.cross(m, route)
			if err != nil {
				return err
			}
			a, err := s.Engine.Solve(x.lowered)
			if err != nil {
				return err
			}
			tried++
			if a.Outcome == model.Inaccurate {
				gaveUp++
				return nil
			}
			lifted := x.lift(a)
			if lifted.Outcome != outcome {
				return fmt.Errorf("solved as %s", lifted.Outcome)
			}
			if off := math.Abs(lifted.Objective-known.Objective) / (1 + math.Abs(known.Objective)); outcome == model.Optimal && !(off <= 1e-6) {
				return fmt.Errorf("objective %.10g, it is %.10g", lifted.Objective, known.Objective)
			}
			report := check.Examine(m, lifted, check.Tolerances{})
			if report.Verdict != check.Checked {
				// A ray that is right but far out is the engine's.
				if report.CertificateSize > 1e8 {
					gaveUp++
					return nil
				}
				return fmt.Errorf("the lifted answer is %s: %s", report.Verdict, report.Reasons[0])
			}
			return nil
		})
		if err != nil {
			return err
		}
		if 2*gaveUp > tried {
			return fmt.Errorf("the engine gave up on %d of %d %s models", gaveUp, tried, outcome)
		}
	}
	return nil
}
