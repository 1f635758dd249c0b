package bridgetest

import (
	"reflect"
	"slices"
	"testing"

	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
)

// mutant is a bridge with a mistake in its lowering.
type mutant struct {
	bridges.Bridge
	change func(*bridges.Lowering)
}

func (m mutant) Lower(it bridges.Item) bridges.Lowering {
	low := copyLowering(m.Bridge.Lower(it))
	m.change(&low)
	return low
}

// mistakes are the slips of a hand at a keyboard: a sign, a factor, a conjugate, a term or a constant forgotten.
var mistakes = []struct {
	name   string
	change func(*bridges.Lowering)
}{
	{"conjugated", func(l *bridges.Lowering) { eachCoefficient(l, conj) }},
	{"doubled", func(l *bridges.Lowering) { eachCoefficient(l, func(z complex128) complex128 { return 2 * z }) }},
	{"halved in one place", func(l *bridges.Lowering) { lastCoefficient(l, func(z complex128) complex128 { return z / 2 }) }},
	{"negated in one place", func(l *bridges.Lowering) { lastCoefficient(l, func(z complex128) complex128 { return -z }) }},
	{"forgotten in one place", func(l *bridges.Lowering) { lastCoefficient(l, func(complex128) complex128 { return 0 }) }},
	{"real and imaginary part swapped", func(l *bridges.Lowering) {
		eachCoefficient(l, func(z complex128) complex128 { return complex(imag(z), real(z)) })
	}},
	{"imaginary parts forgotten", func(l *bridges.Lowering) {
		eachCoefficient(l, func(z complex128) complex128 { return complex(real(z), 0) })
	}},
	{"constants forgotten", func(l *bridges.Lowering) {
		for i := range l.Constraints {
			clear(l.Constraints[i].Const)
		}
	}},
	{"constants negated", func(l *bridges.Lowering) {
		for i := range l.Constraints {
			for r, c := range l.Constraints[i].Const {
				l.Constraints[i].Const[r] = -c
			}
		}
	}},
	{"limits swapped", func(l *bridges.Lowering) {
		for i := range l.Constraints {
			c := &l.Constraints[i].Cone
			for r := range c.Lower {
				c.Lower[r], c.Upper[r] = -c.Upper[r], -c.Lower[r]
			}
		}
	}},
}

// equivalent lists the mutants that are right after all: the way back does not see them and the cone does not mind.
var equivalent = map[string]string{
	"nonneg-map/slack-in, halved in one place":     "half a slack is a slack",
	"nonneg-block/open-out, halved in one place":   "half an entry is nonnegative when the entry is",
	"lorentz-block/open-out, negated in one place": "the cone is symmetric in the sign of its tail",
}

// TryMutants makes each mistake in each bridge where it changes anything: on the way there only and on the way
// back only, where it must break a law; and in both, where some mistakes are no more than another correct formula.
func TryMutants(t *testing.T, engine *Engine) {
	made, harmless := 0, 0
	for _, b := range bridges.All() {
		t.Run(b.ID(), func(t *testing.T) {
			for _, mistake := range mistakes {
				m := mutant{b, mistake.change}
				if !differs(b, m) {
					continue
				}
				for name, s := range map[string]Subject{
					"there": {Bridge: b, LowersAs: m, Engine: engine},
					"back":  {Bridge: b, LiftsAs: m, Engine: engine},
				} {
					made++
					if name == "back" && !backMatters(b, m) {
						made--
						continue
					}
					_, right := equivalent[b.ID()+", "+mistake.name]
					if (len(Broken(s)) == 0) != (right && name == "there") {
						t.Errorf("%s on the way %s: %v", mistake.name, name, Broken(s))
					}
				}
				made++
				if len(Broken(Subject{Bridge: b, LowersAs: m, LiftsAs: m, Engine: engine})) == 0 {
					harmless++
					t.Logf("%s both ways breaks no law", mistake.name)
				}
			}
		})
	}
	t.Logf("%d mutants, %d of them other formulas that hold", made, harmless)
	if made < 300 {
		t.Errorf("only %d mutants were made", made)
	}
}

// samples are items of the bridge's kind, of the sizes that it takes up to 4.
func samples(b bridges.Bridge) []bridges.Item {
	var out []bridges.Item
	from := b.From()
	for n := 1; n <= 4; n++ {
		size := n
		if from.Separable() {
			size = 1
		}
		if _, ok := b.Yields(size); !ok {
			continue
		}
		it := bridges.Item{Kind: from, Rows: n, Cone: model.Cone{Kind: from.Cone}}
		block := &model.Block{Field: from.Field, Rows: n, Cols: 1, Cone: from.Cone}
		if from.Field.IsMatrix() {
			block.Cols, it.Rows = n, model.PackedLen(n)
		}
		count := it.Rows
		if from.Place != capability.OnMap {
			count = block.Entries()
		}
		lower, upper := make([]complex128, count), make([]complex128, count)
		for k := range lower {
			lower[k], upper[k] = complex(-1-float64(k), -2), complex(3, 4+float64(k))
		}
		if from.Cone == model.Range {
			it.Cone.Lower, it.Cone.Upper = lower, upper
		}
		if from.Place == capability.OnBounds {
			block.Cone, block.Bounds = model.Free, &model.Bounds{Lower: lower, Upper: upper}
		}
		if from.Place != capability.OnMap {
			it.Block = block
		}
		out = append(out, it)
	}
	return out
}

func differs(b bridges.Bridge, m mutant) bool {
	return slices.ContainsFunc(samples(b), func(it bridges.Item) bool {
		return !reflect.DeepEqual(copyLowering(b.Lower(it)), m.Lower(it))
	})
}

// backMatters: the way back uses combinations of old rows and of values only, not constants, limits or the columns of new
// blocks in constraints.
func backMatters(b bridges.Bridge, m mutant) bool {
	return slices.ContainsFunc(samples(b), func(it bridges.Item) bool {
		right, wrong := copyLowering(b.Lower(it)), m.Lower(it)
		if !reflect.DeepEqual(right.Values, wrong.Values) {
			return true
		}
		for i := range right.Constraints {
			if !reflect.DeepEqual(right.Constraints[i].Of, wrong.Constraints[i].Of) {
				return true
			}
		}
		return false
	})
}

func copyLowering(l bridges.Lowering) bridges.Lowering {
	l.Values = copyCombination(l.Values)
	l.Constraints = slices.Clone(l.Constraints)
	for i := range l.Constraints {
		c := &l.Constraints[i]
		c.Of, c.New, c.Const = copyCombination(c.Of), copyCombination(c.New), slices.Clone(c.Const)
		c.Cone.Lower, c.Cone.Upper = slices.Clone(c.Cone.Lower), slices.Clone(c.Cone.Upper)
	}
	return l
}

func copyCombination(c *bridges.Combination) *bridges.Combination {
	if c == nil {
		return nil
	}
	out := &bridges.Combination{Lin: c.Lin}
	out.Lin.Re, out.Lin.Z = slices.Clone(c.Lin.Re), slices.Clone(c.Lin.Z)
	if c.Conj != nil {
		m := *c.Conj
		m.Re, m.Z = slices.Clone(m.Re), slices.Clone(m.Z)
		out.Conj = &m
	}
	return out
}

// matrices lists all matrices of coefficients of a lowering.
func matrices(l *bridges.Lowering) []*model.Matrix {
	var out []*model.Matrix
	add := func(c *bridges.Combination) {
		if c == nil {
			return
		}
		out = append(out, &c.Lin)
		if c.Conj != nil {
			out = append(out, c.Conj)
		}
	}
	add(l.Values)
	for i := range l.Constraints {
		add(l.Constraints[i].Of)
		add(l.Constraints[i].New)
	}
	return out
}

func eachCoefficient(l *bridges.Lowering, change func(complex128) complex128) {
	for _, m := range matrices(l) {
		for p := range m.Z {
			m.Z[p] = change(m.Z[p])
		}
	}
}

func lastCoefficient(l *bridges.Lowering, change func(complex128) complex128) {
	all := matrices(l)
	for _, m := range slices.Backward(all) {
		if n := len(m.Z); n > 0 {
			m.Z[n-1] = change(m.Z[n-1])
			return
		}
	}
}

func conj(z complex128) complex128 { return complex(real(z), -imag(z)) }
