package rows

import (
	"slices"
	"testing"

	"towpath/model"
)

func TestTermsAreSortedAddedAndDropped(t *testing.T) {
	r := New(model.Complex, 3)
	r.Add(2, 5, 1)
	r.Add(0, 4, 2i)
	r.Add(0, 1, 3)
	r.Add(0, 4, 1)
	r.Add(1, 7, 2)
	r.Add(1, 7, -2)
	r.AddConj(2, 0, 1-1i)
	r.Const(1, 4)
	c := r.In(model.Zero, "here")
	m := c.Map.Lin
	if !slices.Equal(m.Start, []int{0, 2, 2, 3}) || !slices.Equal(m.Col, []uint32{1, 4, 5}) ||
		!slices.Equal(m.Z, []complex128{3, 1 + 2i, 1}) || m.Re != nil {
		t.Errorf("got %+v", m)
	}
	if c.Map.Conj == nil || !slices.Equal(c.Map.Conj.Start, []int{0, 0, 0, 1}) || c.Map.ConstAt(1) != 4 || c.Name != "here" {
		t.Errorf("got %+v", c)
	}
}

func TestRealCoefficientsAreStoredAsReal(t *testing.T) {
	r := New(model.Real, 1)
	r.Add(0, 0, 2)
	if m := r.In(model.Nonneg, "").Map.Lin; m.Z != nil || !slices.Equal(m.Re, []float64{2}) {
		t.Errorf("got %+v", m)
	}
}
