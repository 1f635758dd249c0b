package model_test

import (
	"errors"
	"math"
	"testing"

	"towpath/model"
)

var (
	inf = math.Inf(1)
	nan = math.NaN()
	// Limits that leave both parts of a complex number open.
	below, above = complex(-inf, -inf), complex(inf, inf)
)

// harbour is a sound model with blocks of every field and constraints of every cone. Its 18 entries:
//
//	0-2 x, 3-6 z, 7-9 S, 10-12 H (11 off the diagonal), 13-15 block 4, 16-17 q
func harbour() *model.Model {
	return &model.Model{
		Name: "harbour",
		Blocks: []model.Block{
			{Name: "x", Field: model.Real, Rows: 3, Cols: 1, Cone: model.Nonneg,
				Bounds: &model.Bounds{Lower: []complex128{0, complex(-inf, 0), 1}, Upper: []complex128{9, complex(inf, inf), 1}}},
			{Name: "z", Field: model.Complex, Rows: 2, Cols: 2,
				Bounds: &model.Bounds{Lower: []complex128{below, -1 - 1i, below, 0}, Upper: []complex128{above, 1 + 1i, 2 + 2i, above}}},
			{Name: "S", Field: model.Symmetric, Rows: 2, Cols: 2, Cone: model.PSD},
			{Name: "H", Field: model.Hermitian, Rows: 2, Cols: 2, Cone: model.PSD,
				Bounds: &model.Bounds{Lower: []complex128{0, -1 - 1i, 0}, Upper: []complex128{4, 1 + 1i, complex(inf, 0)}}},
			{Field: model.Real, Rows: 3, Cols: 1, Cone: model.RotatedLorentz},
			{Name: "q", Field: model.Real, Rows: 2, Cols: 1, Cone: model.Lorentz},
		},
		Objective: model.Objective{Sense: model.Maximize, Col: []uint32{0, 3, 10, 11}, Coef: []complex128{2, 1 - 1i, -1, 1i}, Const: 5},
		Constraints: []model.Constraint{
			{Name: "balance", Map: model.Map{Field: model.Complex,
				Lin:   model.Matrix{Start: []int{0, 2, 3}, Col: []uint32{0, 3, 4}, Z: []complex128{1i, 1 + 1i, 2}},
				Conj:  &model.Matrix{Start: []int{0, 1, 3}, Col: []uint32{3, 4, 11}, Re: []float64{1, -1, 2}},
				Const: []complex128{3i, -1}},
				Cone: model.Cone{Kind: model.Zero}},
			{Name: "window", Map: model.Map{Field: model.Complex, Lin: list([]uint32{3, 4})},
				Cone: model.Cone{Kind: model.Range, Lower: []complex128{-1 - 1i, below}, Upper: []complex128{1 + 1i, complex(inf, 2)}}},
			{Map: model.Map{Field: model.Real, // constraint 2 has no name
				Lin:   model.Matrix{Start: []int{0, 2, 3}, Col: []uint32{0, 3, 10}, Z: []complex128{1, 2i, 1 + 1e-14i}},
				Const: []complex128{1, 2 + 1e-14i}},
				Cone: model.Cone{Kind: model.Nonneg}},
			{Name: "limits", Map: model.Map{Field: model.Real, Lin: list([]uint32{0, 1})},
				Cone: model.Cone{Kind: model.Range, Lower: []complex128{complex(-inf, 0), 1}, Upper: []complex128{4, complex(inf, 0)}}},
			{Name: "disc", Map: model.Map{Field: model.Complex, Lin: list([]uint32{0, 3, 4})}, Cone: model.Cone{Kind: model.Lorentz}},
			{Name: "product", Map: model.Map{Field: model.Complex, Lin: list([]uint32{0, 1, 3})}, Cone: model.Cone{Kind: model.RotatedLorentz}},
			{Name: "ball", Map: model.Map{Field: model.Real, Lin: list([]uint32{16, 0})}, Cone: model.Cone{Kind: model.Lorentz}},
			{Name: "bowl", Map: model.Map{Field: model.Real, Lin: list([]uint32{13, 14})}, Cone: model.Cone{Kind: model.RotatedLorentz}},
			{Name: "gram", Map: model.Map{Field: model.Hermitian, Lin: list([]uint32{10, 3, 12}), Const: []complex128{1, 1i, 1}},
				Cone: model.Cone{Kind: model.PSD}},
			{Name: "stress", Map: model.Map{Field: model.Symmetric, Lin: list([]uint32{7, 8, 9})}, Cone: model.Cone{Kind: model.PSD}},
			{Name: "twins", Map: model.Map{Field: model.Hermitian, Lin: list([]uint32{7, 11, 9})}, Cone: model.Cone{Kind: model.Zero}},
		},
	}
}

// list maps one entry to each row, with coefficient one.
func list(cols []uint32) model.Matrix {
	m := model.Matrix{Start: []int{0}, Col: cols}
	for k := range cols {
		m.Start, m.Re = append(m.Start, k+1), append(m.Re, 1)
	}
	return m
}

// broken is a way to break the harbour, and the one fault that must come of it.
type broken struct {
	name                       string
	by                         func(m *model.Model)
	path, place, problem, cure string
}

func tryBroken(t *testing.T, cases []broken) {
	t.Helper()
	names := map[string]bool{}
	for _, c := range cases {
		if names[c.name] {
			t.Errorf("two cases are called %s", c.name)
		}
		names[c.name] = true
		t.Run(c.name, func(t *testing.T) {
			m := harbour()
			c.by(m)
			want := model.Fault{Path: c.path, Place: c.place, Problem: c.problem, Cure: c.cure}
			got := faultsOf(t, m)
			if len(got.Faults) != 1 || got.More != 0 || got.Faults[0] != want {
				t.Errorf("got %d faults and %d more:\n%+v\nwant\n%+v", len(got.Faults), got.More, got.Faults, want)
			}
			if says := c.place + ": " + c.problem + "; " + c.cure; got.Error() != says {
				t.Errorf("the error says\n%s\nwant\n%s", got, says)
			}
		})
	}
}

// faultsOf validates a model that must be refused.
func faultsOf(t *testing.T, m *model.Model) *model.FaultError {
	t.Helper()
	err := m.Validate()
	var faults *model.FaultError
	if !errors.As(err, &faults) {
		t.Fatalf("got error %v, want faults", err)
	}
	return faults
}

func TestSoundModels(t *testing.T) {
	for _, c := range []struct {
		name string
		by   func(m *model.Model)
	}{
		{"the harbour", func(*model.Model) {}},
		{"no names", func(m *model.Model) {
			m.Name = ""
			for k := range m.Blocks {
				m.Blocks[k].Name = ""
			}
			for k := range m.Constraints {
				m.Constraints[k].Name = ""
			}
		}},
		{"a block and a constraint share a name", func(m *model.Model) { m.Constraints[0].Name = "x" }},
		{"a name of 256 bytes with accents", func(m *model.Model) { m.Name = long(254) + "é" }},
		{"no constraints", func(m *model.Model) { m.Constraints = nil }},
		{"no objective", func(m *model.Model) { m.Objective = model.Objective{} }},
		{"rows without coefficients", func(m *model.Model) {
			m.Constraints[2].Map.Lin = model.Matrix{Start: []int{0, 0, 0}}
		}},
		{"the last entry has a coefficient", func(m *model.Model) { m.Objective.Col[3], m.Objective.Coef[3] = 17, 1 }},
		{"bounds meet", func(m *model.Model) { m.Blocks[0].Bounds.Lower[0] = 9 }},
		{"every block free", func(m *model.Model) {
			for k := range m.Blocks {
				m.Blocks[k].Cone = model.Free
			}
		}},
		{"the largest matrix", func(m *model.Model) {
			m.Blocks = append(m.Blocks, model.Block{Name: "huge", Field: model.Symmetric, Rows: model.MaxOrder, Cols: model.MaxOrder})
		}},
		{"as many entries as there may be", func(m *model.Model) {
			m.Blocks = append(m.Blocks, model.Block{Name: "huge", Rows: model.MaxEntries - 18, Cols: 1})
			m.Objective.Col[3], m.Objective.Coef[3] = model.MaxEntries-1, 1
		}},
	} {
		t.Run(c.name, func(t *testing.T) {
			m := harbour()
			c.by(m)
			if err := m.Validate(); err != nil {
				t.Errorf("refused:\n%v", err)
			}
		})
	}
}
