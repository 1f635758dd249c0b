package csdp

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"towpath/model"
	"towpath/model/check"
)

// Files of two small models, spelled out by hand.
func TestFilesWordByWord(t *testing.T) {
	third := 1.0 / 3
	equality := &model.Model{
		Blocks:    []model.Block{psd(2), nonneg(2)},
		Objective: cost(2, term{0, 1}, term{1, 3}, term{3, 5}),
		Constraints: []model.Constraint{
			in(model.Real, model.Zero, []float64{-1}, []term{{0, 1}, {2, 1}}),
			in(model.Real, model.Zero, []float64{-7}, []term{{1, 4}, {4, third}}),
		},
	}
	inequality := &model.Model{
		Blocks:    []model.Block{free(2)},
		Objective: cost(2, term{0, 3}, term{1, -1}),
		Constraints: []model.Constraint{
			in(model.Symmetric, model.PSD, []float64{1, 0, -4}, []term{{0, 1}}, []term{{1, 2}}, []term{{0, 1}}),
			in(model.Real, model.Nonneg, []float64{0.5}, []term{{1, 1}}),
		},
	}
	for _, c := range []struct {
		name string
		m    *model.Model
		make func(*model.Model) (*problem, error)
		want []string
	}{
		{"equality: minus the costs, halves off the diagonal", equality, fromEquality, []string{"2", "2", "2 -2", "1 7",
			"0 1 1 1 -1", "0 1 1 2 -1.5", "0 2 1 1 -5", "1 1 1 1 1", "1 1 2 2 1", "2 1 1 2 2", "2 2 2 2 0.33333333333333331"}},
		{"inequality: minus the constants, entries as they are", inequality, fromInequality, []string{"2", "2", "2 -1", "3 -1",
			"0 1 1 1 -1", "0 1 2 2 4", "0 2 1 1 -0.5", "1 1 1 1 1", "1 1 2 2 1", "2 1 1 2 2", "2 2 1 1 1"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, err := c.make(valid(t, c.m))
			if err != nil {
				t.Fatal(err)
			}
			text := string(p.text())
			readSDPAFile(t, text)
			got := strings.Split(strings.TrimSuffix(text, "\n"), "\n")
			for i := range got {
				got[i] = strings.TrimSpace(got[i])
			}
			if !slices.Equal(got, c.want) {
				t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(c.want, "\n"))
			}
		})
	}
}

// written is a random problem and its file; ok is false for models that are answered without one, whose answer is examined.
func written(t *testing.T, m *model.Model, from func(*model.Model) (*problem, error)) (p *problem, f *sdpaFile, ok bool) {
	t.Helper()
	p, err := from(valid(t, m))
	if err != nil {
		if !strings.Contains(err.Error(), "at least one row that is not empty") {
			t.Fatal(err)
		}
		return nil, nil, false
	}
	if p.settled != nil {
		if r := check.Examine(m, p.settled, check.Tolerances{}); r.Verdict != check.Checked {
			t.Errorf("settled as %s: %v", p.settled.Outcome, r)
		}
		return nil, nil, false
	}
	f = readSDPAFile(t, string(p.text()))
	next := 0
	for n, at := range p.where {
		if at >= 0 && at != next {
			t.Fatalf("row %d went to %d, want %d", n, at, next)
		}
		if at >= 0 {
			next++
		}
	}
	if next != len(f.a) {
		t.Fatalf("%d rows have a place, %d are in the file", next, len(f.a))
	}
	return p, f, true
}

// same compares two sums whose terms have the given size.
func same(t *testing.T, what string, got, want, size float64) {
	t.Helper()
	if !(math.Abs(got-want) <= 1e-13*size) {
		t.Errorf("%s is %.17g in the file and %.17g in the model", what, got, want)
	}
}

// randomSides draws y and matrices X for a problem, X packed by block as parse gives it, and full.
func randomSides(rng *rand.Rand, p *problem) (y []float64, packed [][]float64, full [][][]float64) {
	for range p.a {
		y = append(y, rng.NormFloat64())
	}
	for _, b := range p.blocks {
		square := make([][]float64, b.size)
		for i := range square {
			square[i] = make([]float64, b.size)
		}
		var list []float64
		for j := range b.size {
			for i := j; i < b.size; i++ {
				if b.diagonal && i != j {
					continue
				}
				v := rng.NormFloat64()
				list = append(list, v)
				square[i][j], square[j][i] = v, v
			}
		}
		packed, full = append(packed, list), append(full, square)
	}
	return y, packed, full
}

// combination is sum y_i A_i - C at one place, and the sum of the sizes of its terms.
func (f *sdpaFile) combination(y []float64, k, i, j int) (v, size float64) {
	for n := range f.matrices {
		c := f.matrices[n][k][i][j]
		if n == 0 {
			c = -c
		} else {
			c *= y[n-1]
		}
		v += c
		size += math.Abs(c)
	}
	return v, size
}

// eachEntry walks the packed lower triangle of the blocks, or their diagonals.
func (f *sdpaFile) eachEntry(visit func(k, at, i, j int)) {
	for k, n := range f.sizes {
		at := 0
		for j := range max(n, -n) {
			for i := j; i < n || i == j; i++ {
				visit(k, at, i, j)
				at++
			}
		}
	}
}

// For any X, tr(A_i X) - a_i are the rows and -tr(C X) is the objective; for any y, sum y_i A_i - C is the reduced cost
// for the multipliers that y is read as.
func TestEqualityFileIsTheModel(t *testing.T) {
	compared := 0
	for seed := range uint64(300) {
		rng := rand.New(rand.NewPCG(seed, 1))
		m := randomEquality(rng)
		t.Run(seedName(seed), func(t *testing.T) {
			p, f, ok := written(t, m, fromEquality)
			if !ok {
				return
			}
			compared++
			y, packed, x := randomSides(rng, p)
			point := p.values(packed)
			n := 0
			for k := range m.Constraints {
				for _, row := range m.RowsAt(k, point) {
					at := p.where[n]
					n++
					if at < 0 {
						same(t, "a row left out", 0, real(row), 1)
						continue
					}
					v, size := product(f.matrices[at+1], x)
					same(t, "a row", v-f.a[at], real(row), size+math.Abs(f.a[at]))
				}
			}
			v, size := product(f.matrices[0], x)
			same(t, "the objective", -v, m.ObjectiveAt(point)-m.Objective.Const, size+math.Abs(m.Objective.Const))
			same(t, "tr(C X) as the driver has it", v, p.trace(packed), size)
			left := m.Gradient()
			for k, v := range p.rows(y).Constraints {
				for b, sum := range m.AdjointAt(k, v).Values {
					for e := range sum {
						left.Values[b][e] -= sum[e]
					}
				}
			}
			f.eachEntry(func(k, at, i, j int) {
				v, size := f.combination(y, k, i, j)
				same(t, "a reduced cost", v, real(left.Values[k][at]), size)
			})
		})
	}
	if compared < 100 {
		t.Errorf("only %d models came to a file", compared)
	}
}

// For any y, sum y_i A_i - C are the rows and a'y is the objective; for any X, tr(A_i X) is the adjoint of the multipliers
// that X is read as.
func TestInequalityFileIsTheModel(t *testing.T) {
	compared := 0
	for seed := range uint64(300) {
		rng := rand.New(rand.NewPCG(seed, 2))
		m := randomInequality(rng)
		t.Run(seedName(seed), func(t *testing.T) {
			p, f, ok := written(t, m, fromInequality)
			if !ok {
				return
			}
			compared++
			y, packed, x := randomSides(rng, p)
			point := p.columns(y)
			rows := make([][]complex128, len(m.Constraints))
			for k := range rows {
				rows[k] = m.RowsAt(k, point)
			}
			f.eachEntry(func(k, at, i, j int) {
				v, size := f.combination(y, k, i, j)
				same(t, "a row", v, real(rows[k][at]), size)
			})
			v, size := 0.0, math.Abs(m.Objective.Const)
			for i, a := range f.a {
				v += a * y[i]
				size += math.Abs(a * y[i])
			}
			same(t, "the objective", v, m.ObjectiveAt(point)-m.Objective.Const, size)
			sums := make([]float64, len(p.where))
			for k, v := range p.matrices(packed).Constraints {
				n := 0
				for _, list := range m.AdjointAt(k, v).Values {
					for _, s := range list {
						sums[n] += real(s)
						n++
					}
				}
			}
			for n, at := range p.where {
				if at < 0 {
					same(t, "a column left out", 0, sums[n], 1)
					continue
				}
				v, size := product(f.matrices[at+1], x)
				same(t, "a sum of multipliers", v, sums[n], size)
			}
		})
	}
	if compared < 100 {
		t.Errorf("only %d models came to a file", compared)
	}
}
