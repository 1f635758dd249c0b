package bridges

import "towpath/model"

// All lists the catalogue. Order does not matter to anybody.
func All() []Bridge {
	return []Bridge{
		// real and imaginary parts
		newComplexFree(),
		newComplexZero(),
		newComplexRange(),
		newComplexLorentz(),
		newComplexRotatedLorentz(),
		// packed triangles
		newHermitianFree(),
		newSymmetricFree(),
		newHermitianZero(),
		newSymmetricZero(),
		// Hermitian to symmetric
		newHermitianPSDBlock(),
		newHermitianPSDMap(),
		// small matrices
		newOrderOneBlock(model.Hermitian),
		newOrderOneBlock(model.Symmetric),
		newOrderOneMap(model.Hermitian),
		newOrderOneMap(model.Symmetric),
		newOrderTwoBlock(model.Hermitian),
		newOrderTwoBlock(model.Symmetric),
		newOrderTwoMap(model.Hermitian),
		newOrderTwoMap(model.Symmetric),
		// lorentz cones
		newLorentzRay(),
		newRotateBlock(model.Lorentz),
		newRotateBlock(model.RotatedLorentz),
		newRotateMap(model.Lorentz),
		newRotateMap(model.RotatedLorentz),
		newArrow(model.Real),
		newArrow(model.Complex),
		// stance: map or block
		newSlackIn(model.Real, model.Nonneg),
		newSlackIn(model.Real, model.Lorentz),
		newSlackIn(model.Real, model.RotatedLorentz),
		newSlackIn(model.Symmetric, model.PSD),
		newSlackIn(model.Hermitian, model.PSD),
		newOpenOut(model.Real, model.Nonneg),
		newOpenOut(model.Real, model.Lorentz),
		newOpenOut(model.Real, model.RotatedLorentz),
		newOpenOut(model.Symmetric, model.PSD),
		newOpenOut(model.Hermitian, model.PSD),
		// linear plumbing
		newRangeSides(),
		newEqualityPair(),
		newDifference(),
		newBoundRows(model.Real),
		newBoundRows(model.Complex),
		newBoundRows(model.Symmetric),
		newBoundRows(model.Hermitian),
	}
}
