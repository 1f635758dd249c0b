package bridges

import (
	"towpath/capability"
	"towpath/model"
)

// lorentzRay writes a lorentz cone without tail, t >= 0, as a nonnegative row.
// Toll: a row in place of a cone.
type lorentzRay struct{ rule }

func newLorentzRay() Bridge {
	return lorentzRay{rule{"lorentz-map/dimension-1", mapKind(model.Real, model.Lorentz), "definition of the 2-norm"}}
}

func (lorentzRay) Yields(n int) ([]capability.Demand, bool) {
	return sizes{}.and(mapKind(model.Real, model.Nonneg), 1), n == 1
}

func (lorentzRay) Lower(Item) Lowering {
	return Lowering{Constraints: []Image{image(model.Real, model.Nonneg, identity(1, 1))}}
}
