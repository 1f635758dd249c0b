package modeltest

import (
	"fmt"
	"math"
	"math/rand/v2"

	"towpath/model"
)

// Recipe says what random model to build from its answer. The same recipe gives the same model.
type Recipe struct {
	Seed    uint64
	Outcome model.Outcome // Optimal, Infeasible or Unbounded
	// Linear keeps to real blocks, free or nonneg, and real zero, nonneg and range maps.
	Linear bool
	// Degenerate leaves strict complementarity out: some pairs vanish on both sides.
	Degenerate bool
	// Spread scales every constraint by up to ten to the power of plus or minus Spread.
	Spread float64
}

// String names the recipe for test messages.
func (r Recipe) String() string {
	return fmt.Sprintf("%s seed=%d linear=%t degenerate=%t spread=%g", r.Outcome, r.Seed, r.Linear, r.Degenerate, r.Spread)
}

// Make builds the model and its answer, right up to rounding. An optimal answer has a point and multipliers with no gap
// between them: the point is chosen in the cones, the multipliers in the faces opposite to it, then the constants and
// the objective that make both right. An infeasible or unbounded one has its certificate alone.
func (r Recipe) Make() (*model.Model, *model.Answer) {
	g := &garden{Recipe: r, rng: rand.New(rand.NewPCG(r.Seed, uint64(r.Outcome)))}
	g.blocks()
	g.constraints()
	m := &model.Model{Name: "random", Blocks: g.bs, Constraints: g.cs}
	switch r.Outcome {
	case model.Infeasible:
		return m, g.infeasible(m)
	case model.Unbounded:
		return m, g.unbounded(m)
	}
	return m, g.optimal(m)
}

// garden is a model being grown.
type garden struct {
	Recipe
	rng *rand.Rand
	bs  []model.Block
	cs  []model.Constraint
	// Opposite pairs of every block and every constraint: an element of the cone, and of the dual cone's opposite face.
	x, s [][]complex128
	f, y [][]complex128
}

type shape struct {
	field model.Field
	cone  model.ConeKind
}

// blank is a constraint of a shape, without coefficients.
func blank(s shape, rows int) *model.Constraint {
	return &model.Constraint{Map: model.Map{Field: s.field, Lin: model.Matrix{Start: make([]int, rows+1)}}, Cone: model.Cone{Kind: s.cone}}
}

func (g *garden) blocks() {
	shapes := []shape{{model.Real, model.Free}, {model.Real, model.Nonneg}}
	if !g.Linear {
		shapes = append(shapes, shape{model.Real, model.Lorentz}, shape{model.Real, model.RotatedLorentz}, shape{model.Complex, model.Free},
			shape{model.Symmetric, model.Free}, shape{model.Symmetric, model.PSD}, shape{model.Hermitian, model.Free}, shape{model.Hermitian, model.PSD})
	}
	g.addBlock(shape{model.Real, model.Free}, 1, 1) // the pivot of unbounded models
	for range 2 + g.rng.IntN(4) {
		s := shapes[g.rng.IntN(len(shapes))]
		switch n := 1 + g.rng.IntN(3); {
		case s.field.IsMatrix():
			g.addBlock(s, n, n)
		case s.cone == model.Free:
			g.addBlock(s, n, 1+g.rng.IntN(2))
		default:
			g.addBlock(s, 1+n, 1)
		}
	}
}

func (g *garden) addBlock(s shape, rows, cols int) {
	b := model.Block{Name: fmt.Sprintf("x%d", len(g.bs)), Field: s.field, Cone: s.cone, Rows: rows, Cols: cols}
	g.bs = append(g.bs, b)
	// A block's cone is that of a constraint with the same rows.
	x, z := g.pair(blank(s, b.Entries()))
	g.x, g.s = append(g.x, x), append(g.s, z)
}

func (g *garden) constraints() {
	shapes := []shape{{model.Real, model.Zero}, {model.Real, model.Nonneg}, {model.Real, model.Range}}
	if !g.Linear {
		shapes = append(shapes, shape{model.Complex, model.Zero}, shape{model.Complex, model.Range}, shape{model.Symmetric, model.Zero},
			shape{model.Hermitian, model.Zero}, shape{model.Real, model.Lorentz}, shape{model.Complex, model.Lorentz},
			shape{model.Real, model.RotatedLorentz}, shape{model.Complex, model.RotatedLorentz}, shape{model.Symmetric, model.PSD},
			shape{model.Hermitian, model.PSD})
	}
	for k := range 2 + g.rng.IntN(5) {
		s := shapes[g.rng.IntN(len(shapes))]
		rows := 2 + g.rng.IntN(3)
		if s.cone == model.Lorentz {
			rows = 1 + g.rng.IntN(4)
		}
		if s.field.IsMatrix() {
			rows = model.PackedLen(1 + g.rng.IntN(3))
		}
		if s.cone == model.Zero {
			rows = 1 // few equalities, so that the rest keeps room
			if s.field == model.Hermitian && g.rng.IntN(2) == 0 {
				rows = 3
			}
		}
		c := model.Constraint{Name: fmt.Sprintf("row %d", k), Cone: model.Cone{Kind: s.cone}, Map: g.linear(s, rows)}
		f, y := g.pair(&c)
		g.cs, g.f, g.y = append(g.cs, c), append(g.f, f), append(g.y, y)
	}
}

// optimal chooses constants so that F(x) = f, bounds that hold x, and the objective c = F^* y + z + s.
func (g *garden) optimal(m *model.Model) *model.Answer {
	z := g.bounds(m)
	x := &model.Point{Values: g.x}
	g.shift(m, x)
	sum := &model.Point{Values: g.s}
	for k := range m.Constraints {
		sum = plus(sum, m.AdjointAt(k, g.y[k]))
	}
	for b, zb := range z {
		for k, v := range zb {
			sum.Values[b][k] += v
		}
	}
	m.Objective.Const = g.rng.NormFloat64()
	g.aim(m, sum)
	if g.rng.IntN(2) == 0 {
		m.Objective.Sense = model.Maximize
		m.Objective.Const = -m.Objective.Const
		for k := range m.Objective.Coef {
			m.Objective.Coef[k] = -m.Objective.Coef[k]
		}
	}
	v := m.ObjectiveAt(x)
	return &model.Answer{Outcome: model.Optimal, Objective: v, Bound: v, Point: x, Multipliers: &model.Multipliers{Constraints: g.y, Bounds: z}}
}

// infeasible adds one equality whose multiplier 1 takes the sum of all the others to nothing.
func (g *garden) infeasible(m *model.Model) *model.Answer {
	z := g.bounds(m)
	g.shift(m, &model.Point{Values: g.x})
	sum := &model.Point{Values: g.s}
	for k := range m.Constraints {
		sum = plus(sum, m.AdjointAt(k, g.y[k]))
	}
	for b, zb := range z {
		for k, v := range zb {
			sum.Values[b][k] += v
		}
	}
	last := model.Constraint{Name: "contradiction", Cone: model.Cone{Kind: model.Zero}, Map: model.Map{Lin: model.Matrix{Start: []int{0, 0}}}}
	starts := m.Starts()
	inner := 0.0
	for b := range m.Blocks {
		for k, v := range sum.Values[b] {
			if v == 0 {
				continue
			}
			// <1, coef x> = Re(coef x) must be -w <v, x>.
			w := m.Blocks[b].Weight(k)
			last.Map.Lin.Col = append(last.Map.Lin.Col, uint32(starts[b]+k))
			last.Map.Lin.Z = append(last.Map.Lin.Z, complex(-w, 0)*conj(v))
			inner += w * real(conj(v)*g.x[b][k])
		}
	}
	last.Map.Lin.Start[1] = len(last.Map.Lin.Col)
	// The dual objective without this row is <sum, x>, because every pair is opposite: with the constant it is 1.
	last.Map.Const = []complex128{complex(inner-1, 0)}
	m.Constraints = append(m.Constraints, last)
	g.aim(m, g.price(m, z))
	return &model.Answer{Outcome: model.Infeasible, Objective: math.NaN(), Bound: math.NaN(),
		Farkas: &model.Multipliers{Constraints: append(g.y, []complex128{1}), Bounds: z}}
}

// price is an objective for which there are multipliers, so that an infeasible model is not unbounded as well: the F^* y + z
// + s of other multipliers, which push where the certificate's do.
func (g *garden) price(m *model.Model, z [][]complex128) *model.Point {
	sum := &model.Point{}
	for b := range m.Blocks {
		v := make([]complex128, m.Blocks[b].Entries())
		_, s := g.pair(blank(shape{m.Blocks[b].Field, m.Blocks[b].Cone}, len(v)))
		copy(v, s)
		for k := range z[b] {
			v[k] += 2 * z[b][k]
		}
		sum.Values = append(sum.Values, v)
	}
	for k := range m.Constraints {
		y := g.noiseRow()
		if k < len(g.y) {
			y = scaled(g.y[k], 0.5+g.rng.Float64())
		}
		sum = plus(sum, m.AdjointAt(k, y))
	}
	return sum
}

// noiseRow is a multiplier for one real equality.
func (g *garden) noiseRow() []complex128 { return []complex128{g.number(false)} }

func scaled(v []complex128, by float64) []complex128 {
	out := make([]complex128, len(v))
	for k, x := range v {
		out[k] = complex(by, 0) * x
	}
	return out
}

// unbounded lets the pivot, the first entry, take the maps of a ray to where their cones recede.
func (g *garden) unbounded(m *model.Model) *model.Answer {
	ray := &model.Point{}
	for b := range m.Blocks {
		d, _ := g.pair(blank(shape{m.Blocks[b].Field, m.Blocks[b].Cone}, m.Blocks[b].Entries()))
		ray.Values = append(ray.Values, d)
	}
	ray.Values[0][0] = 1
	g.recedingBounds(m, ray)
	for k := range m.Constraints {
		c := &m.Constraints[k]
		goal := make([]complex128, c.Map.Rows())
		if c.Cone.Kind != model.Zero && c.Cone.Kind != model.Range {
			goal, _ = g.pair(c)
		}
		at := m.RowsAt(k, ray) // there are no constants yet
		for r := range goal {
			goal[r] -= at[r]
		}
		c.Map.Lin = addFirstColumn(&c.Map.Lin, goal)
	}
	g.shift(m, &model.Point{Values: g.x})
	cost := g.noise(m)
	slope := 0.0
	for b := range m.Blocks {
		for k, v := range cost[b] {
			slope += m.Blocks[b].Weight(k) * real(conj(v)*ray.Values[b][k])
		}
	}
	cost[0][0] -= complex(slope+1, 0)
	g.aim(m, &model.Point{Values: cost})
	return &model.Answer{Outcome: model.Unbounded, Objective: math.NaN(), Bound: math.NaN(), Ray: ray}
}

// shift chooses the constants that make the maps take x to f.
func (g *garden) shift(m *model.Model, x *model.Point) {
	for k := range m.Constraints {
		f := m.RowsAt(k, x)
		for r := range f {
			f[r] = g.f[k][r] - f[r]
		}
		m.Constraints[k].Map.Const = f
	}
}

// aim makes the objective <c, x> + constant.
func (g *garden) aim(m *model.Model, c *model.Point) {
	col := uint32(0)
	for b := range m.Blocks {
		for k, v := range c.Values[b] {
			if v != 0 {
				m.Objective.Col = append(m.Objective.Col, col)
				m.Objective.Coef = append(m.Objective.Coef, conj(v)*complex(m.Blocks[b].Weight(k), 0))
			}
			col++
		}
	}
}

// noise is a random element for every block.
func (g *garden) noise(m *model.Model) [][]complex128 {
	var out [][]complex128
	for b := range m.Blocks {
		v := make([]complex128, m.Blocks[b].Entries())
		for k := range v {
			v[k] = g.number(!m.Blocks[b].RealEntry(k))
		}
		out = append(out, v)
	}
	return out
}

func plus(a, b *model.Point) *model.Point {
	out := &model.Point{}
	for i := range a.Values {
		v := make([]complex128, len(a.Values[i]))
		for k := range v {
			v[k] = a.Values[i][k] + b.Values[i][k]
		}
		out.Values = append(out.Values, v)
	}
	return out
}
