package check

import (
	"fmt"
	"math"

	"towpath/model"
)

// misshapen says what is wrong with the lengths or numbers of an answer, or "".
func misshapen(m *model.Model, a *model.Answer) string {
	for _, p := range []struct {
		what string
		of   *model.Point
	}{{"the point", a.Point}, {"the ray", a.Ray}} {
		if p.of == nil {
			continue
		}
		if len(p.of.Values) != len(m.Blocks) {
			return fmt.Sprintf("%s has %d blocks, the model %d", p.what, len(p.of.Values), len(m.Blocks))
		}
		for b, v := range p.of.Values {
			if bad := misfit(v, m.Blocks[b].Entries(), m.Blocks[b].RealEntry); bad != "" {
				return fmt.Sprintf("%s in %s %s", p.what, blockTitle(m, b), bad)
			}
		}
	}
	for _, y := range []struct {
		what string
		of   *model.Multipliers
	}{{"the multiplier", a.Multipliers}, {"the certificate", a.Farkas}} {
		if y.of == nil {
			continue
		}
		if len(y.of.Constraints) != len(m.Constraints) {
			return fmt.Sprintf("%ss are for %d constraints, the model has %d", y.what, len(y.of.Constraints), len(m.Constraints))
		}
		for k, v := range y.of.Constraints {
			c := &m.Constraints[k]
			if bad := misfit(v, c.Map.Rows(), c.RealRow); bad != "" {
				return fmt.Sprintf("%s at %s %s", y.what, constraintTitle(m, k), bad)
			}
		}
		for b := range m.Blocks {
			if m.Blocks[b].Bounds == nil {
				continue
			}
			if len(y.of.Bounds) != len(m.Blocks) {
				return fmt.Sprintf("%s has no numbers for bounds, and %s has some", y.what, blockTitle(m, b))
			}
			if bad := misfit(y.of.Bounds[b], m.Blocks[b].Entries(), m.Blocks[b].RealEntry); bad != "" {
				return fmt.Sprintf("%s at the bounds of %s %s", y.what, blockTitle(m, b), bad)
			}
		}
	}
	return ""
}

func misfit(v []complex128, n int, isReal func(int) bool) string {
	if len(v) != n {
		return fmt.Sprintf("has %d numbers in place of %d", len(v), n)
	}
	for k, x := range v {
		if math.IsNaN(real(x)-real(x)) || math.IsNaN(imag(x)-imag(x)) {
			return fmt.Sprintf("is %v at place %d", x, k)
		}
		if imag(x) != 0 && isReal(k) {
			return fmt.Sprintf("has an imaginary part at place %d, which is real", k)
		}
	}
	return ""
}

func blockTitle(m *model.Model, b int) string { return model.Title("block", b, m.Blocks[b].Name) }
func constraintTitle(m *model.Model, k int) string {
	return model.Title("constraint", k, m.Constraints[k].Name)
}
