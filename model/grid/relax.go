package grid

import (
	"fmt"
	"math"

	"towpath/model"
	"towpath/model/internal/rows"
)

// Relaxation says what is kept of "W is V V^H".
type Relaxation uint8

const (
	SecondOrder  Relaxation = iota // |W_ij|^2 <= W_ii W_jj per connected pair, rotated lorentz
	Pairwise                       // the same, 2 x 2 Hermitian matrices
	Semidefinite                   // W positive semidefinite
)

// String names the relaxation for model names and tables.
func (r Relaxation) String() string {
	switch r {
	case SecondOrder:
		return "second-order cones"
	case Pairwise:
		return "2x2 matrices"
	case Semidefinite:
		return "semidefinite"
	}
	return "unknown relaxation"
}

// Names of the blocks of a relaxed network. All powers are per unit of base_mva.
const (
	SquaredVoltage = "squared voltage magnitude" // real, one per bus; absent from Semidefinite
	VoltageProduct = "voltage product"           // complex, one per connected pair; for Semidefinite the Hermitian W
	ActivePower    = "active power"              // real, one per generator in service
	ReactivePower  = "reactive power"            // real, one per generator in service
	SquaredPower   = "squared active power"      // real, one per generator with a quadratic cost
)

// Relax writes the cheapest dispatch of the network, in $/h, under the relaxation. Buses of kind 4 and everything at
// them, and branches and generators out of service, are left out. Constraints are named after their places, like
// "power balance at bus 3".
func Relax(n *Network, relaxation Relaxation) (*model.Model, error) {
	if relaxation > Semidefinite {
		return nil, fmt.Errorf("network %q: there is no relaxation number %d", n.Name, relaxation)
	}
	if err := n.Validate(); err != nil {
		return nil, err
	}
	t, err := survey(n)
	if err != nil {
		return nil, err
	}
	d := &draft{topology: t, base: n.BaseMVA, relaxation: relaxation}
	d.model = &model.Model{Name: fmt.Sprintf("%s, %s", n.Name, relaxation)}
	d.addVoltages()
	d.addGenerators()
	d.addFixed()
	d.addCosts()
	d.addBalances()
	d.addBranches()
	d.addCones()
	return d.model, nil
}

// draft is a model being written, and where its entries are.
type draft struct {
	*topology
	base       float64
	relaxation Relaxation
	model      *model.Model

	entries           int   // so far
	squares, products []int // entry of W_ii by bus, of W_ij by pair
	active, reactive  int   // first entries
}

// block appends a block and returns its first entry.
func (d *draft) block(b model.Block) int {
	first := d.entries
	d.model.Blocks = append(d.model.Blocks, b)
	d.entries += b.Entries()
	return first
}

// addVoltages declares the voltage products with the limits on single ones: vmin^2 <= W_ii <= vmax^2, and for every
// connected pair the rectangle that voltage and angle limits leave to W_ij.
func (d *draft) addVoltages() {
	n := len(d.buses)
	d.squares, d.products = make([]int, n), make([]int, len(d.pairs))
	if d.relaxation == Semidefinite {
		b := unbounded(model.Block{Name: VoltageProduct, Field: model.Hermitian, Rows: n, Cols: n, Cone: model.PSD})
		first := d.block(b)
		for i, bus := range d.buses {
			k := model.PackedIndex(n, i, i)
			d.squares[i] = first + k
			b.Bounds.Lower[k], b.Bounds.Upper[k] = square(bus.VMinPU), square(bus.VMaxPU)
			// A diagonal entry is real: nothing limits the imaginary part that it does not have.
		}
		for p, pair := range d.pairs {
			k := model.PackedIndex(n, pair.high, pair.low)
			d.products[p] = first + k
			b.Bounds.Lower[k], b.Bounds.Upper[k] = pair.box(d.buses)
		}
		return
	}
	b := unbounded(model.Block{Name: SquaredVoltage, Field: model.Real, Rows: n, Cols: 1})
	first := d.block(b)
	for i, bus := range d.buses {
		d.squares[i] = first + i
		b.Bounds.Lower[i], b.Bounds.Upper[i] = square(bus.VMinPU), square(bus.VMaxPU)
	}
	if len(d.pairs) == 0 {
		return
	}
	b = unbounded(model.Block{Name: VoltageProduct, Field: model.Complex, Rows: len(d.pairs), Cols: 1})
	first = d.block(b)
	for p, pair := range d.pairs {
		d.products[p] = first + p
		b.Bounds.Lower[p], b.Bounds.Upper[p] = pair.box(d.buses)
	}
}

// addGenerators declares the injections with their limits.
func (d *draft) addGenerators() {
	if len(d.generators) == 0 {
		return
	}
	limits := func(name string, of func(*Generator) (low, high float64)) int {
		b := unbounded(model.Block{Name: name, Field: model.Real, Rows: len(d.generators), Cols: 1})
		for k, g := range d.generators {
			low, high := of(g)
			b.Bounds.Lower[k], b.Bounds.Upper[k] = complex(low/d.base, 0), complex(high/d.base, 0)
		}
		return d.block(b)
	}
	d.active = limits(ActivePower, func(g *Generator) (float64, float64) { return g.PMinMW, g.PMaxMW })
	d.reactive = limits(ReactivePower, func(g *Generator) (float64, float64) { return g.QMinMVAr, g.QMaxMVAr })
}

// addFixed turns equal lower and upper bounds into an equality. Between two equal bounds there is no interior, and their
// multipliers have no limit; an equality has neither fault.
func (d *draft) addFixed() {
	first := 0
	for i := range d.model.Blocks {
		b := &d.model.Blocks[i]
		for k := range b.Entries() {
			if !b.RealEntry(k) || b.Bounds.Lower[k] != b.Bounds.Upper[k] {
				continue
			}
			r := rows.New(model.Real, 1)
			r.Add(0, first+k, 1)
			r.Const(0, -b.Bounds.Lower[k])
			b.Bounds.Lower[k], b.Bounds.Upper[k] = complex(math.Inf(-1), 0), complex(math.Inf(1), 0)
			d.add(r, model.Zero, "%s, fixed at %s", b.Name, d.place(b, k))
		}
		first += b.Entries()
	}
}

// place names the bus or generator that entry k of a block belongs to.
func (d *draft) place(b *model.Block, k int) string {
	switch b.Name {
	case ActivePower, ReactivePower:
		return fmt.Sprintf("generator %d at bus %d", k+1, d.generators[k].Bus)
	case SquaredVoltage:
		return fmt.Sprintf("bus %d", d.buses[k].ID)
	}
	i, _ := model.PackedAt(b.Rows, k)
	return fmt.Sprintf("bus %d", d.buses[i].ID)
}

// addCosts writes the objective. The square of an active power is an entry of its own, held above the square by a
// rotated lorentz cone, 2 (1/2) s >= p^2; as costs are convex, it lies on the square at an optimum.
func (d *draft) addCosts() {
	cost := make([]complex128, 0, 2*len(d.generators))
	cols := make([]uint32, 0, 2*len(d.generators))
	var curved []int
	for k, g := range d.generators {
		c := g.CostPerH
		if len(c) > 0 {
			d.model.Objective.Const += c[0]
		}
		if len(c) > 1 && c[1] != 0 {
			cols, cost = append(cols, uint32(d.active+k)), append(cost, complex(c[1]*d.base, 0))
		}
		if len(c) > 2 && c[2] != 0 {
			curved = append(curved, k)
		}
	}
	if len(curved) > 0 {
		first := d.block(model.Block{Name: SquaredPower, Field: model.Real, Rows: len(curved), Cols: 1})
		for i, k := range curved {
			cols, cost = append(cols, uint32(first+i)), append(cost, complex(d.generators[k].CostPerH[2]*d.base*d.base, 0))
			r := rows.New(model.Real, 3)
			r.Add(0, first+i, 1)
			r.Const(1, 0.5)
			r.Add(2, d.active+k, 1)
			d.add(r, model.RotatedLorentz, "square of active power of generator %d at bus %d", k+1, d.generators[k].Bus)
		}
	}
	d.model.Objective.Col, d.model.Objective.Coef = cols, cost
}

// addBalances writes Kirchhoff's current law times voltage, one complex equality per bus:
//
//	generation - demand - conj(shunt) W_ii - sum of powers entering branches = 0
func (d *draft) addBalances() {
	balance := make([]*rows.Rows, len(d.buses))
	for i, bus := range d.buses {
		balance[i] = rows.New(model.Complex, 1)
		balance[i].Const(0, complex(-bus.DemandMW/d.base, -bus.DemandMVAr/d.base))
		balance[i].Add(0, d.squares[i], -complex(bus.ShuntMW/d.base, -bus.ShuntMVAr/d.base))
	}
	for k, g := range d.generators {
		r := balance[d.at[g.Bus]]
		r.Add(0, d.active+k, 1)
		r.Add(0, d.reactive+k, 1i)
	}
	for _, l := range d.lines {
		from, to := l.flows()
		d.addFlow(balance[l.from], 0, l, from, false, -1)
		d.addFlow(balance[l.to], 0, l, to, true, -1)
	}
	for i, bus := range d.buses {
		d.add(balance[i], model.Zero, "power balance at bus %d", bus.ID)
	}
}

// addFlow adds scale times the power entering the line at one end to a row.
func (d *draft) addFlow(r *rows.Rows, row int, l line, f flow, atTo bool, scale complex128) {
	own := l.from
	if atTo {
		own = l.to
	}
	r.Add(row, d.squares[own], scale*f.own)
	// The mutual term uses W_own,other. For pairs the product of the bus listed later and the one listed earlier is
	// stored (the lower triangle); the other is its conjugate.
	if own == d.pairs[l.pair].high {
		r.Add(row, d.products[l.pair], scale*f.mutual)
	} else {
		r.AddConj(row, d.products[l.pair], scale*f.mutual)
	}
}

// addBranches writes the ratings, |S| <= rating at both ends, and for every connected pair the angle limits
// tan(low) Re W <= Im W <= tan(high) Re W.
func (d *draft) addBranches() {
	for _, l := range d.lines {
		if l.RatingMVA == 0 {
			continue
		}
		from, to := l.flows()
		for end, f := range []flow{from, to} {
			r := rows.New(model.Complex, 2)
			r.Const(0, complex(l.RatingMVA/d.base, 0))
			d.addFlow(r, 1, l, f, end == 1, 1)
			d.add(r, model.Lorentz, "rating of branch %d at bus %d", l.number, []int{l.From, l.To}[end])
		}
	}
	for p, pair := range d.pairs {
		// Re((a + bi) W) = a Re W - b Im W, in a real row.
		r := rows.New(model.Real, 2)
		r.Add(0, d.products[p], complex(-math.Tan(pair.angles.low), -1))
		r.Add(1, d.products[p], complex(math.Tan(pair.angles.high), 1))
		d.add(r, model.Nonneg, "angle between buses %d and %d", d.buses[pair.high].ID, d.buses[pair.low].ID)
	}
}

// addCones writes what the relaxation keeps of W = V V^H, where W is not a block with a cone of its own.
func (d *draft) addCones() {
	if d.relaxation == Semidefinite {
		return
	}
	for p, pair := range d.pairs {
		var r *rows.Rows
		cone := model.PSD
		i, j := d.squares[pair.high], d.squares[pair.low]
		if d.relaxation == Pairwise {
			r = rows.New(model.Hermitian, 3) // packed: (0,0), (1,0), (1,1)
			r.Add(0, j, 1)
			r.Add(1, d.products[p], 1)
			r.Add(2, i, 1)
		} else {
			cone = model.RotatedLorentz // 2 u v >= |w|^2 with w = sqrt(2) W
			r = rows.New(model.Complex, 3)
			r.Add(0, i, 1)
			r.Add(1, j, 1)
			r.Add(2, d.products[p], math.Sqrt2)
		}
		d.add(r, cone, "voltages at buses %d and %d", d.buses[pair.high].ID, d.buses[pair.low].ID)
	}
}

func (d *draft) add(r *rows.Rows, cone model.ConeKind, name string, a ...any) {
	d.model.Constraints = append(d.model.Constraints, r.In(cone, fmt.Sprintf(name, a...)))
}

func unbounded(b model.Block) model.Block {
	n := b.Entries()
	b.Bounds = &model.Bounds{Lower: make([]complex128, n), Upper: make([]complex128, n)}
	for k := range n {
		low, high := complex(math.Inf(-1), math.Inf(-1)), complex(math.Inf(1), math.Inf(1))
		if b.RealEntry(k) {
			low, high = complex(math.Inf(-1), 0), complex(math.Inf(1), 0)
		}
		b.Bounds.Lower[k], b.Bounds.Upper[k] = low, high
	}
	return b
}

func square(x float64) complex128 { return complex(x*x, 0) }
