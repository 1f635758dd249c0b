package modeltest

import (
	"slices"

	"towpath/model"
)

// Copy returns a model that shares nothing with m, to compare with after something that must not change m.
func Copy(m *model.Model) *model.Model {
	out := *m
	out.Blocks = slices.Clone(m.Blocks)
	for b := range out.Blocks {
		if box := out.Blocks[b].Bounds; box != nil {
			out.Blocks[b].Bounds = &model.Bounds{Lower: slices.Clone(box.Lower), Upper: slices.Clone(box.Upper)}
		}
	}
	out.Objective.Col, out.Objective.Coef = slices.Clone(m.Objective.Col), slices.Clone(m.Objective.Coef)
	out.Constraints = slices.Clone(m.Constraints)
	for k := range out.Constraints {
		c := &out.Constraints[k]
		c.Map.Lin = copyMatrix(&c.Map.Lin)
		if c.Map.Conj != nil {
			conj := copyMatrix(c.Map.Conj)
			c.Map.Conj = &conj
		}
		c.Map.Const = slices.Clone(c.Map.Const)
		c.Cone.Lower, c.Cone.Upper = slices.Clone(c.Cone.Lower), slices.Clone(c.Cone.Upper)
	}
	return &out
}

func copyMatrix(a *model.Matrix) model.Matrix {
	return model.Matrix{Start: slices.Clone(a.Start), Col: slices.Clone(a.Col), Re: slices.Clone(a.Re), Z: slices.Clone(a.Z)}
}
