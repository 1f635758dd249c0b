package endtoend

import (
	"context"
	"math/cmplx"
	"testing"

	"towpath/backends"
	"towpath/backends/interior"
	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"
)

// mistake is a wrong lowering, or a wrong way back, of the kind that teams make when they split models by hand. It is made
// between the broker and the engine, where nothing but the examination can notice it.
type mistake struct {
	name   string
	field  model.Field // of the maps that it is made in
	cone   model.ConeKind
	model  func(*work, *model.Constraint) // changes the map that is sent; nil: none
	answer func(*model.Constraint, []complex128) []complex128
	caught int // the least number of instances on which it must be noticed
}

func mistakes() []mistake {
	hermitian, complexField := model.Hermitian, model.Complex
	return []mistake{
		{"PSD lowered with the conjugate, recovery unchanged", hermitian, model.PSD, (*work).conjugate, nil, 40},
		{"PSD multiplier read from one quarter only", hermitian, model.PSD, nil, scaledRows(func(*model.Constraint, int) complex128 { return 0.5 }), 45},
		{"imaginary half of complex equalities dropped", complexField, model.Zero, (*work).realRows, nil, 10},
		{"imaginary part dropped in complex lorentz cones", complexField, model.Lorentz, (*work).realTail, nil, 12},
		{"complex equality multiplier conjugated", complexField, model.Zero, nil, conjugated, 10},
		{"Hermitian PSD replaced by PSD of the real part", hermitian, model.PSD, (*work).realTriangle, nil, 40},
		{"off-diagonal quarters with equal signs", hermitian, model.PSD, (*work).equalQuarters, quarters, 40},
		{"Hermitian equality multiplier: off-diagonal not halved", hermitian, model.Zero, nil, scaledRows(func(c *model.Constraint, r int) complex128 {
			return complex(c.Weight(r), 0)
		}), 5},
		{"lorentz multiplier: real and imaginary part swapped", complexField, model.Lorentz, nil, swapped, 12},
	}
}

// TestMistakesAreCaught makes one mistake at a time on every published instance that has a map for it. A mistake may be
// without effect (the conjugate of a real matrix); but no answer that passes examination may be wrong, and of each mistake
// at least a known number of instances must be noticed.
func TestMistakesAreCaught(t *testing.T) {
	if testing.Short() {
		t.Skip("takes long")
	}
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	for _, wrong := range mistakes() {
		t.Run(wrong.name, func(t *testing.T) {
			s := newStationOf(t, &sloppy{interior.New(), wrong})
			caught, tried := 0, 0
			for i := range cases {
				c := &cases[i]
				if c.Pathological || !wrong.applies(c.Model) {
					continue
				}
				tried++
				sent, a := s.solve(t, c.Model, &towpathv1.JobOptions{Sheet: interior.ComplexSheet})
				if sent.GetExamination().GetVerdict() != towpathv1.Verdict_VERDICT_CHECKED {
					caught++
					continue
				}
				t.Run(c.ID, func(t *testing.T) { judge(t, c, accuracy{value: 1e-7, multiplier: 1e-5, point: 1e-4}, sent, a) })
			}
			t.Logf("noticed on %d of %d instances", caught, tried)
			if caught < wrong.caught {
				t.Errorf("noticed on %d of %d instances, want %d", caught, tried, wrong.caught)
			}
		})
	}
}

func (w *mistake) applies(m *model.Model) bool {
	for k := range m.Constraints {
		if w.made(&m.Constraints[k]) {
			return true
		}
	}
	return false
}

func (w *mistake) made(c *model.Constraint) bool {
	return c.Map.Field == w.field && c.Cone.Kind == w.cone
}

// sloppy is the engine with a mistake before and after it.
type sloppy struct {
	backends.Driver
	wrong mistake
}

func (s *sloppy) Solve(ctx context.Context, sheet string, m *model.Model, o backends.Options) (*model.Answer, error) {
	bad := modeltest.Copy(m)
	for k := range bad.Constraints {
		if c := &bad.Constraints[k]; s.wrong.made(c) && s.wrong.model != nil {
			s.wrong.model(&work{bad, termsOf(bad, c)}, c)
		}
	}
	a, err := s.Driver.Solve(ctx, sheet, bad, o)
	if err != nil {
		return a, err
	}
	for _, y := range []*model.Multipliers{a.Multipliers, a.Farkas} {
		if y == nil || s.wrong.answer == nil {
			continue
		}
		for k := range m.Constraints {
			if c := &m.Constraints[k]; s.wrong.made(c) {
				y.Constraints[k] = s.wrong.answer(c, y.Constraints[k])
			}
		}
	}
	return a, nil
}

// work is a map taken apart: every row as sum a x + b conj(x) + constant.
type work struct {
	m    *model.Model
	rows []row
}

type row struct {
	a, b     map[uint32]complex128
	constant complex128
}

func termsOf(m *model.Model, c *model.Constraint) []row {
	var out []row
	for r := range c.Map.Rows() {
		one := row{map[uint32]complex128{}, map[uint32]complex128{}, c.Map.ConstAt(r)}
		gather := func(a *model.Matrix, into map[uint32]complex128) {
			for p := a.Start[r]; p < a.Start[r+1]; p++ {
				into[a.Col[p]] += a.At(p)
			}
		}
		gather(&c.Map.Lin, one.a)
		if c.Map.Conj != nil {
			gather(c.Map.Conj, one.b)
		}
		out = append(out, one)
	}
	return out
}

// conjugated is the conjugate of the row.
func (r row) conjugated() row {
	out := row{map[uint32]complex128{}, map[uint32]complex128{}, cmplx.Conj(r.constant)}
	for c, v := range r.a {
		out.b[c] = cmplx.Conj(v)
	}
	for c, v := range r.b {
		out.a[c] = cmplx.Conj(v)
	}
	return out
}

// times is the row by a number; plus a sum of rows.
func (r row) times(z complex128) row {
	out := row{map[uint32]complex128{}, map[uint32]complex128{}, z * r.constant}
	for c, v := range r.a {
		out.a[c] = z * v
	}
	for c, v := range r.b {
		out.b[c] = z * v
	}
	return out
}

func (r row) plus(o row) row {
	out := r.times(1)
	out.constant += o.constant
	for c, v := range o.a {
		out.a[c] += v
	}
	for c, v := range o.b {
		out.b[c] += v
	}
	return out
}

func (r row) re() row { return r.plus(r.conjugated()).times(0.5) }
func (r row) im() row { return r.plus(r.conjugated().times(-1)).times(-0.5i) }

// put writes rows back as a map.
func (w *work) put(c *model.Constraint, field model.Field, rows []row) {
	starts := w.m.Starts()
	isReal := func(col uint32) bool {
		for b := range w.m.Blocks {
			if int(col) < starts[b+1] {
				return w.m.Blocks[b].RealEntry(int(col) - starts[b])
			}
		}
		panic("no such column")
	}
	c.Map = model.Map{Field: field, Lin: model.Matrix{Start: []int{0}}}
	conj := model.Matrix{Start: []int{0}}
	shape := &model.Constraint{Map: model.Map{Field: field, Lin: model.Matrix{Start: make([]int, len(rows)+1)}}, Cone: c.Cone}
	for r, one := range rows {
		for col := range uint32(starts[len(w.m.Blocks)]) {
			a, b := one.a[col], one.b[col]
			if isReal(col) {
				a, b = a+b, 0
			}
			if shape.RealRow(r) {
				a, b = a+cmplx.Conj(b), 0
				if isReal(col) {
					a = complex(real(a), 0)
				}
				one.constant = complex(real(one.constant), 0)
			}
			if a != 0 {
				c.Map.Lin.Col, c.Map.Lin.Z = append(c.Map.Lin.Col, col), append(c.Map.Lin.Z, a)
			}
			if b != 0 {
				conj.Col, conj.Z = append(conj.Col, col), append(conj.Z, b)
			}
		}
		c.Map.Lin.Start, conj.Start = append(c.Map.Lin.Start, len(c.Map.Lin.Col)), append(conj.Start, len(conj.Col))
		c.Map.Const = append(c.Map.Const, one.constant)
	}
	if len(conj.Col) > 0 {
		c.Map.Conj = &conj
	}
}

func (w *work) conjugate(c *model.Constraint) {
	for r := range w.rows {
		w.rows[r] = w.rows[r].conjugated()
	}
	w.put(c, c.Map.Field, w.rows)
}

func (w *work) realRows(c *model.Constraint) {
	for r := range w.rows {
		w.rows[r] = w.rows[r].re()
	}
	w.put(c, model.Real, w.rows)
}

func (w *work) realTail(c *model.Constraint) { w.realRows(c) }

func (w *work) realTriangle(c *model.Constraint) {
	for r := range w.rows {
		w.rows[r] = w.rows[r].re()
	}
	w.put(c, model.Symmetric, w.rows)
}

// equalQuarters is [[A, B], [B, A]] for A + iB, read off as a lower triangle.
func (w *work) equalQuarters(c *model.Constraint) {
	n, _ := model.PackedOrder(len(w.rows))
	var rows []row
	for k := range model.PackedLen(2 * n) {
		i, j := model.PackedAt(2*n, k)
		quarter := row.re
		if (i < n) != (j < n) {
			quarter = row.im
		}
		i, j = i%n, j%n
		rows = append(rows, quarter(w.rows[model.PackedIndex(n, max(i, j), min(i, j))]))
	}
	w.put(c, model.Symmetric, rows)
}

// quarters reads the multiplier of such a matrix as one should that of the right one: (Z11 + Z22) + i (Z21 - Z12).
func quarters(c *model.Constraint, z []complex128) []complex128 {
	n, _ := model.PackedOrder(c.Map.Rows())
	at := func(i, j int) complex128 { return z[model.PackedIndex(2*n, max(i, j), min(i, j))] }
	out := make([]complex128, c.Map.Rows())
	for k := range out {
		i, j := model.PackedAt(n, k)
		out[k] = at(i, j) + at(n+i, n+j)
		if i != j {
			out[k] += 1i * (at(n+i, j) - at(i, n+j))
		}
	}
	return out
}

func scaledRows(by func(*model.Constraint, int) complex128) func(*model.Constraint, []complex128) []complex128 {
	return func(c *model.Constraint, y []complex128) []complex128 {
		for r := range y {
			y[r] *= by(c, r)
		}
		return y
	}
}

func conjugated(_ *model.Constraint, y []complex128) []complex128 {
	for r := range y {
		y[r] = cmplx.Conj(y[r])
	}
	return y
}

func swapped(c *model.Constraint, y []complex128) []complex128 {
	for r := range y {
		if !c.RealRow(r) {
			y[r] = complex(imag(y[r]), real(y[r]))
		}
	}
	return y
}
