package bridges

import (
	"fmt"
	"math"

	"towpath/capability"
	"towpath/model"
)

// draft is a model being lowered. Blocks and maps have numbers that are never reused. The columns of a block are
// allotted once: those of a lowered block stand for combinations of newer ones until the draft is finished.
type draft struct {
	blocks  []draftBlock
	maps    []draftMap
	owner   []int32 // block of every column
	obj     model.Objective
	crossed []crossing // in order of time
}

type draftBlock struct {
	block  model.Block   // without bounds
	bounds *model.Bounds // until they are lowered
	start  int           // first column
	gone   bool          // lowered
	values *Combination  // when gone: entries as a combination of the columns from next on
	next   int
	final  int // place in the finished model, unless gone
}

type draftMap struct {
	c     model.Constraint // over the draft's columns
	gone  bool
	final int
}

// crossing remembers one lowered item for the way back.
type crossing struct {
	item
	low   *Lowering
	image int // number of the first new map
}

// item names a block, a map or the bounds of a block.
type item struct {
	place  capability.Place
	number int
}

// newDraft copies what lowering may change; arrays of coefficients are shared with the model. Bounds and range rows without
// a finite limit say nothing: they count as no item and are left behind, with multipliers of zero.
func newDraft(m *model.Model) *draft {
	d := &draft{obj: m.Objective}
	for i := range m.Blocks {
		b := m.Blocks[i]
		bounds := b.Bounds
		if bounds != nil {
			if _, sides := capability.MeasureBounds(&b); sides == 0 {
				bounds = nil
			}
		}
		b.Bounds = nil
		d.addBlock(b, bounds)
	}
	for k := range m.Constraints {
		_, _, sides := capability.MeasureMap(&m.Constraints[k])
		d.maps = append(d.maps, draftMap{c: m.Constraints[k], gone: sides == 0})
	}
	return d
}

func (d *draft) addBlock(b model.Block, bounds *model.Bounds) int {
	n := len(d.blocks)
	start := len(d.owner)
	for range b.Entries() {
		d.owner = append(d.owner, int32(n))
	}
	d.blocks = append(d.blocks, draftBlock{block: b, bounds: bounds, start: start})
	return n
}

func (d *draft) realColumn(c int) bool {
	b := &d.blocks[d.owner[c]]
	return b.block.RealEntry(c - b.start)
}

// measure says as what an item counts.
func (d *draft) measure(it item) (kind capability.Kind, size, count int) {
	switch it.place {
	case capability.OnMap:
		return capability.MeasureMap(&d.maps[it.number].c)
	case capability.OnBounds:
		b := d.blocks[it.number].block
		b.Bounds = d.blocks[it.number].bounds
		kind, count = capability.MeasureBounds(&b)
		return kind, 1, count
	}
	return capability.MeasureBlock(&d.blocks[it.number].block)
}

// describe gives an item to its bridge.
func (d *draft) describe(it item) Item {
	kind, _, _ := d.measure(it)
	if it.place == capability.OnMap {
		c := &d.maps[it.number].c
		return Item{Kind: kind, Rows: c.Map.Rows(), Cone: c.Cone}
	}
	b := d.blocks[it.number].block
	if it.place == capability.OnBounds {
		b.Bounds = d.blocks[it.number].bounds
	}
	return Item{Kind: kind, Block: &b}
}

// lower carries one item over a bridge and returns the items that it became.
func (d *draft) lower(it item, b Bridge) ([]item, error) {
	if it.place == capability.OnBlock && d.blocks[it.number].bounds != nil {
		return nil, fmt.Errorf("bridge %s: block %d still has its bounds, which go first", b.ID(), it.number)
	}
	low := b.Lower(d.describe(it))
	x := crossing{item: it, low: &low, image: len(d.maps)}
	first := len(d.owner)
	var made []item
	for _, nb := range low.Blocks {
		made = append(made, item{capability.OnBlock, d.addBlock(nb, nil)})
	}
	switch it.place {
	case capability.OnMap:
		d.maps[it.number].gone = true
	case capability.OnBounds:
		d.blocks[it.number].bounds = nil
	case capability.OnBlock:
		old := &d.blocks[it.number]
		old.gone, old.values, old.next = true, low.Values, first
	}
	for i := range low.Constraints {
		made = append(made, item{capability.OnMap, len(d.maps)})
		d.maps = append(d.maps, draftMap{c: d.image(it, &low.Constraints[i], first)})
	}
	if it.place == capability.OnMap { // its coefficients live on in the images; only its shape is still needed
		old := &d.maps[it.number].c
		old.Map = model.Map{Field: old.Map.Field, Lin: model.Matrix{Start: make([]int, old.Map.Rows()+1)}}
	}
	d.crossed = append(d.crossed, x)
	return made, nil
}

// image writes one new constraint over the draft's columns; first is the first column of the new blocks. It has no name:
// names belong to the client's model.
func (d *draft) image(it item, im *Image, first int) model.Constraint {
	c := model.Constraint{Cone: im.Cone, Map: model.Map{Field: im.Field}}
	shape := im.shape()
	var old *model.Constraint
	start := 0
	if it.place == capability.OnMap {
		old = &d.maps[it.number].c
	} else {
		start = d.blocks[it.number].start
	}
	w := newWriter(d, im.Rows)
	consts := make([]complex128, im.Rows)
	some := false
	for r := range im.Rows {
		k := complex128(0)
		if im.Const != nil {
			k = im.Const[r]
		}
		im.Of.each(r, func(j int, a, b complex128) {
			if old == nil {
				w.add(uint32(start+j), a, b)
				return
			}
			x := old.Map.ConstAt(j)
			k += a*x + b*conj(x)
			w.addRow(old, j, a, b)
		})
		im.New.each(r, func(j int, a, b complex128) { w.add(uint32(first+j), a, b) })
		realRow := shape.RealRow(r)
		if realRow {
			k = complex(real(k), 0)
		}
		consts[r], some = k, some || k != 0
		w.endRow(realRow)
	}
	c.Map.Lin, c.Map.Conj = w.matrices()
	if some {
		c.Map.Const = consts
	}
	return c
}

// shape is a constraint with the image's field, cone and number of rows, and nothing in it.
func (im *Image) shape() *model.Constraint {
	return &model.Constraint{Cone: im.Cone, Map: model.Map{Field: im.Field, Lin: model.Matrix{Start: make([]int, im.Rows+1)}}}
}

// each visits row r: column j with its coefficient and that of its conjugate. A nil combination has none.
func (c *Combination) each(r int, visit func(j int, a, b complex128)) {
	if c == nil {
		return
	}
	for p := c.Lin.Start[r]; p < c.Lin.Start[r+1]; p++ {
		visit(int(c.Lin.Col[p]), c.Lin.At(p), 0)
	}
	if c.Conj != nil {
		for p := c.Conj.Start[r]; p < c.Conj.Start[r+1]; p++ {
			visit(int(c.Conj.Col[p]), 0, c.Conj.At(p))
		}
	}
}

func conj(c complex128) complex128 { return complex(real(c), -imag(c)) }

func isFinite(x float64) bool { return !math.IsInf(x, 0) }
