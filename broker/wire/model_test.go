package wire

import (
	"bytes"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/encoding/protojson"
	"google.golang.org/protobuf/proto"
)

// overWire sends a message through its bytes.
func overWire[M proto.Message](t *testing.T, m, empty M) M {
	t.Helper()
	raw, err := proto.Marshal(m)
	if err != nil {
		t.Fatal(err)
	}
	if err := proto.Unmarshal(raw, empty); err != nil {
		t.Fatal(err)
	}
	return empty
}

// Every model comes back as it was, whether its numbers travel as terms or as arrays.
func TestModelsComeBack(t *testing.T) {
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	var models []*model.Model
	for _, c := range cases {
		models = append(models, c.Model)
	}
	for _, n := range []int{1, 2, 5, 30, 150} { // from few terms to arrays everywhere
		m := sample(rand.New(rand.NewPCG(7, uint64(n))), n)
		if err := m.Validate(); err != nil {
			t.Fatal(err)
		}
		models = append(models, m)
	}
	for _, m := range models {
		got, err := ModelFromProto(overWire(t, ModelToProto(m), &towpathv1.Model{}))
		if err != nil {
			t.Fatalf("%s: %v", m.Name, err)
		}
		if err := got.Validate(); err != nil {
			t.Fatalf("%s: %v", m.Name, err)
		}
		sameModel(t, got, m)
		if ModelID(got) != ModelID(m) {
			t.Errorf("%s: the name of the content changed on the way", m.Name)
		}
	}
}

// A model written by hand: what each short form means, in numbers.
func TestReadableModel(t *testing.T) {
	const text = `{
		"name": "by hand",
		"blocks": [
			{"name": "v", "field": "FIELD_COMPLEX", "rows": 2, "lower": {"re": [-1], "im": [-2]}, "upper": {"re": [4, 5]}},
			{"name": "W", "field": "FIELD_HERMITIAN", "rows": 2, "cone": "CONE_PSD"},
			{"field": "FIELD_SYMMETRIC", "rows": 2}],
		"objective": {"sense": "SENSE_MAXIMIZE", "constant": 7, "terms": [
			{"block": "W", "entry": [0, 1], "re": 1, "im": 2},
			{"block": "v", "entry": [1], "re": 3, "im": 4, "conjugate": true}]},
		"constraints": [
			{"field": "FIELD_COMPLEX", "rows": 2, "cone": "CONE_ZERO", "terms": [
				{"row": [1], "block": "W", "entry": [0, 1], "re": 1, "im": 2},
				{"row": [1], "block": "W", "entry": [1, 0], "re": 5, "conjugate": true},
				{"row": [1], "block": "W", "entry": [1, 1], "re": 6, "conjugate": true},
				{"block": "v", "re": 1}, {"block_number": 0, "re": 2, "im": 1},
				{"block_number": 2, "entry": [0, 1], "re": 9}]},
			{"field": "FIELD_HERMITIAN", "rows": 2, "cone": "CONE_PSD", "constant": {"re": [1, 2, 3], "im": [0, 5, 0]}, "terms": [
				{"row": [1, 0], "block": "v", "re": 8}]},
			{"field": "FIELD_REAL", "rows": 1, "cone": "CONE_RANGE", "upper": {"re": [6]}, "terms": [{"block": "v", "re": 1}]}]
	}`
	p := &towpathv1.Model{}
	if err := protojson.Unmarshal([]byte(text), p); err != nil {
		t.Fatal(err)
	}
	got, err := ModelFromProto(p)
	if err != nil {
		t.Fatal(err)
	}
	if err := got.Validate(); err != nil {
		t.Fatal(err)
	}
	inf := math.Inf(1)
	// Columns: v is 0, 1; W is 2 (0,0), 3 (1,0), 4 (1,1); the symmetric block is 5, 6 (1,0), 7.
	want := &model.Model{Name: "by hand",
		Blocks: []model.Block{
			{Name: "v", Field: model.Complex, Rows: 2, Cols: 1, Bounds: &model.Bounds{
				Lower: []complex128{complex(-1, -2), complex(-1, -2)}, // one for all
				Upper: []complex128{complex(4, inf), complex(5, inf)}, // imaginary parts are free
			}},
			{Name: "W", Field: model.Hermitian, Rows: 2, Cols: 2, Cone: model.PSD},
			{Field: model.Symmetric, Rows: 2, Cols: 2},
		},
		// Re(c conj(x)) = Re(conj(c) x); the upper triangle is the conjugate of the lower.
		Objective: model.Objective{Sense: model.Maximize, Const: 7, Col: []uint32{1, 3}, Coef: []complex128{3 - 4i, 1 - 2i}},
		Constraints: []model.Constraint{
			{Cone: model.Cone{Kind: model.Zero}, Map: model.Map{Field: model.Complex,
				Lin:  model.Matrix{Start: []int{0, 2, 3}, Col: []uint32{0, 6, 4}, Z: []complex128{3 + 1i, 9, 6}},
				Conj: &model.Matrix{Start: []int{0, 0, 1}, Col: []uint32{3}, Z: []complex128{6 + 2i}}}},
			{Cone: model.Cone{Kind: model.PSD}, Map: model.Map{Field: model.Hermitian, Const: []complex128{1, 2 + 5i, 3},
				Lin: model.Matrix{Start: []int{0, 0, 1, 1}, Col: []uint32{0}, Re: []float64{8}}}},
			{Cone: model.Cone{Kind: model.Range, Lower: []complex128{complex(-inf, 0)}, Upper: []complex128{6}}, Map: model.Map{Field: model.Real,
				Lin: model.Matrix{Start: []int{0, 1}, Col: []uint32{0}, Re: []float64{1}}}},
		},
	}
	sameModel(t, got, want)
}

// Three forms of the same numbers.
func TestNumbersInThreeForms(t *testing.T) {
	reals, complexes := []float64{1, -2.5, math.Inf(1)}, []complex128{1 + 2i, -3}
	for _, c := range []struct {
		name string
		n    *towpathv1.Numbers
		want []complex128
	}{
		{"re", &towpathv1.Numbers{Re: reals}, []complex128{1, -2.5, complex(math.Inf(1), 0)}},
		{"re and im", &towpathv1.Numbers{Re: []float64{1, -3}, Im: []float64{2, 0}}, complexes},
		{"f64", &towpathv1.Numbers{F64: arrayOf(bytesIn(reals, false, encodeReal))}, []complex128{1, -2.5, complex(math.Inf(1), 0)}},
		{"c128", &towpathv1.Numbers{C128: arrayOf(bytesIn(complexes, false, encodeComplex))}, complexes},
		{"none", &towpathv1.Numbers{}, nil},
	} {
		got, err := numbersFromProto(c.n, "p", "here")
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		sameNumbers(t, c.name, got, c.want)
	}
}

// Bytes are read and written alike where they lie, one by one, and when they lie crookedly.
func TestArraysWithAndWithoutSharing(t *testing.T) {
	z := []complex128{1 + 2i, complex(math.Inf(-1), 1e-300), -0.5}
	starts := []int{0, 3, 1 << 40}
	columns := []uint32{1, math.MaxUint32}
	// 1 + 2i as little-endian IEEE 754, from the standard's definition: 1 is 3FF0..., 2 is 4000...
	first := []byte{0, 0, 0, 0, 0, 0, 0xf0, 0x3f, 0, 0, 0, 0, 0, 0, 0, 0x40}
	for _, share := range []bool{false, littleEndian()} {
		raw := bytesIn(z, share, encodeComplex)
		if !bytes.Equal(raw[:16], first) {
			t.Errorf("1+2i is written as %x", raw[:16])
		}
		crooked := append([]byte{9}, raw...)[1:]
		for _, data := range [][]byte{raw, crooked} {
			for _, shareBack := range []bool{false, littleEndian()} {
				sameNumbers(t, "values", numbersIn(data, shareBack, decodeComplex), z)
			}
		}
		if got := numbersIn(bytesIn(starts, share, encodeStart), !share, decodeStart); !slices.Equal(got, starts) {
			t.Errorf("row starts %v", got)
		}
		if got := numbersIn(bytesIn(columns, share, encodeColumn), !share, decodeColumn); !slices.Equal(got, columns) {
			t.Errorf("columns %v", got)
		}
		if got := numbersIn(bytesIn([]float64{1.5}, share, encodeReal), !share, decodeReal); !slices.Equal(got, []float64{1.5}) {
			t.Errorf("reals %v", got)
		}
	}
	if got := numbersIn(nil, true, decodeReal); len(got) != 0 {
		t.Errorf("nothing gave %v", got)
	}
}

// The same model has the same name in both forms; every change of a number, a place or a word gives another.
func TestModelID(t *testing.T) {
	fresh := func() *model.Model { return sample(rand.New(rand.NewPCG(3, 3)), 3) }
	p := ModelToProto(fresh())
	for k, c := range fresh().Constraints { // the same in compressed rows
		p.Constraints[k].Terms = nil
		p.Constraints[k].Coefficients = matrixToProto(&c.Map.Lin)
		if c.Map.Conj != nil {
			p.Constraints[k].ConjugateCoefficients = matrixToProto(c.Map.Conj)
		}
	}
	compressed, err := ModelFromProto(p)
	if err != nil {
		t.Fatal(err)
	}
	base := ModelID(fresh())
	if ModelID(compressed) != base {
		t.Error("terms and compressed rows have different names")
	}
	empty := fresh()
	empty.Constraints[0].Map.Conj = &model.Matrix{Start: []int{0, 0, 0, 0}}
	if ModelID(empty) != base {
		t.Error("no coefficients on conjugates have another name than none")
	}
	seen := map[string]string{base: "nothing"}
	for _, c := range []struct {
		name   string
		change func(*model.Model)
	}{
		{"the name", func(m *model.Model) { m.Name = "other" }},
		{"a block's name", func(m *model.Model) { m.Blocks[0].Name = "y" }},
		{"a block's cone", func(m *model.Model) { m.Blocks[0].Cone = model.Lorentz }},
		{"a block's shape", func(m *model.Model) { m.Blocks[1].Rows, m.Blocks[1].Cols = 2, 3 }},
		{"a bound", func(m *model.Model) { m.Blocks[0].Bounds.Lower[1] -= 1 }},
		{"no bounds", func(m *model.Model) { m.Blocks[0].Bounds = nil }},
		{"the sense", func(m *model.Model) { m.Objective.Sense = model.Minimize }},
		{"the objective", func(m *model.Model) { m.Objective.Coef[0] += 1 }},
		{"the objective's constant", func(m *model.Model) { m.Objective.Const = 0 }},
		{"a constraint's name", func(m *model.Model) { m.Constraints[0].Name = "other" }},
		{"a constraint's cone", func(m *model.Model) { m.Constraints[0].Cone.Kind = model.Nonneg }},
		{"a column", func(m *model.Model) { m.Constraints[1].Map.Lin.Col[0]++ }},
		{"a coefficient", func(m *model.Model) { m.Constraints[1].Map.Lin.Z[0] += 1i }},
		{"a row start", func(m *model.Model) { m.Constraints[1].Map.Lin.Start[1]-- }},
		{"a coefficient on a conjugate", func(m *model.Model) { m.Constraints[1].Map.Conj.Z[0] *= 2 }},
		{"a constant", func(m *model.Model) { m.Constraints[2].Map.Const[0] += 1 }},
		{"a limit", func(m *model.Model) { m.Constraints[7].Cone.Upper[0] += 1 }},
		{"one constraint less", func(m *model.Model) { m.Constraints = m.Constraints[:7] }},
	} {
		m := fresh()
		c.change(m)
		id := ModelID(m)
		if other, ok := seen[id]; ok {
			t.Errorf("changing %s gives the same name as changing %s", c.name, other)
		}
		seen[id] = c.name
	}
}
