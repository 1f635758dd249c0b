package model

import (
	"fmt"
	"math"
)

const (
	// MaxEntries is the largest number of entries: columns are 32-bit.
	MaxEntries = math.MaxUint32
	// MaxOrder is the largest order of a matrix: its packed length stays within MaxEntries.
	MaxOrder = 92681
)

// Validate checks everything that the package comment requires of a model. The error is a *FaultError. Sizes are
// checked before anything is multiplied or allocated, so that a hostile model cannot overflow.
func (m *Model) Validate() error {
	v := &validator{m: m}
	v.model()
	if v.total == 0 {
		return nil
	}
	return &FaultError{Faults: v.faults, More: v.total - len(v.faults)}
}

// validator walks a model and gathers faults.
type validator struct {
	m      *Model
	faults []Fault
	total  int
	starts []int // of the blocks, once all of them are sound
}

func (v *validator) fault(path, place, problem, cure string) {
	v.total++
	if len(v.faults) < shownFaults {
		v.faults = append(v.faults, Fault{path, place, problem, cure})
	}
}

func (v *validator) model() {
	v.name("name", "the model", v.m.Name)
	if len(v.m.Blocks) == 0 {
		v.fault("blocks", "the model", "it has no blocks", "give at least one block of decision variables")
		return
	}
	seen := map[string]int{}
	sound, total := true, 0
	for k := range v.m.Blocks {
		b := &v.m.Blocks[k]
		path, place := fmt.Sprintf("blocks[%d]", k), Title("block", k, b.Name)
		v.unique(path, place, "block", b.Name, k, seen)
		if !v.block(path, place, b) {
			sound = false
			continue
		}
		n := b.Entries()
		if n > MaxEntries-total {
			v.fault(path, place, "the blocks together have more than 4294967295 entries", "split the model")
			return
		}
		total += n
		v.bounds(path, place, b)
	}
	if !sound {
		return // columns mean nothing then
	}
	v.starts = v.m.Starts()
	v.objective()
	seen = map[string]int{}
	for k := range v.m.Constraints {
		c := &v.m.Constraints[k]
		path, place := fmt.Sprintf("constraints[%d]", k), Title("constraint", k, c.Name)
		v.unique(path, place, "constraint", c.Name, k, seen)
		v.constraint(path, place, c)
	}
}

func (v *validator) block(path, place string, b *Block) bool {
	if b.Field > Hermitian {
		v.fault(path+".field", place, fmt.Sprintf("field number %d is unknown", b.Field), "use real, complex, symmetric or hermitian")
		return false
	}
	if b.Rows < 1 || b.Cols < 1 {
		side := ".rows"
		if b.Rows >= 1 {
			side = ".cols"
		}
		v.fault(path+side, place, fmt.Sprintf("its shape is %d x %d", b.Rows, b.Cols), "give at least one row and one column")
		return false
	}
	if b.Field.IsMatrix() {
		if b.Rows != b.Cols {
			v.fault(path+".cols", place, fmt.Sprintf("a %s matrix of shape %d x %d is not square", b.Field, b.Rows, b.Cols), "give the order as rows and columns")
			return false
		}
		if b.Rows > MaxOrder {
			v.fault(path+".rows", place, fmt.Sprintf("order %d is larger than %d", b.Rows, MaxOrder), "split the block")
			return false
		}
	} else if b.Rows > MaxEntries/b.Cols {
		v.fault(path+".rows", place, fmt.Sprintf("%d x %d entries are more than 4294967295", b.Rows, b.Cols), "split the block")
		return false
	}
	allowed := b.Cone == Free
	switch b.Field {
	case Real:
		allowed = allowed || b.Cone == Nonneg || b.Cone == Lorentz || b.Cone == RotatedLorentz
	case Symmetric, Hermitian:
		allowed = allowed || b.Cone == PSD
	}
	if b.Cone > Box {
		v.fault(path+".cone", place, fmt.Sprintf("cone number %d is unknown", b.Cone), "use free, nonneg, lorentz, rotated-lorentz or psd")
	} else if !allowed {
		v.fault(path+".cone", place, fmt.Sprintf("a %s block cannot lie in the cone %s", b.Field, b.Cone),
			"real blocks may be free, nonneg, lorentz or rotated-lorentz, complex ones free, matrices free or psd; write other sets as constraints")
	} else if b.Cone == RotatedLorentz && b.Entries() < 2 {
		v.fault(path+".rows", place, "a rotated lorentz cone has at least 2 entries", "give u, v and the rest")
	}
	return true
}

func (v *validator) bounds(path, place string, b *Block) {
	if b.Bounds == nil {
		return
	}
	n := b.Entries()
	if len(b.Bounds.Lower) != n || len(b.Bounds.Upper) != n {
		v.fault(path+".bounds", place, fmt.Sprintf("it has %d lower and %d upper bounds for %d entries", len(b.Bounds.Lower), len(b.Bounds.Upper), n),
			"give one of each per entry, infinite where there is none")
		return
	}
	for k := range n {
		v.limits(path+".bounds", fmt.Sprintf("%s, entry %d", place, k), b.Bounds.Lower[k], b.Bounds.Upper[k], b.RealEntry(k))
	}
}

// limits checks a pair of lower and upper limits, real and imaginary part.
func (v *validator) limits(path, place string, lower, upper complex128, isReal bool) {
	check := func(what string, lo, up float64) {
		switch {
		case math.IsNaN(lo) || math.IsNaN(up):
			v.fault(path, place, fmt.Sprintf("a limit on the %s is NaN", what), "send numbers, infinite where there is no limit")
		case math.IsInf(lo, 1):
			v.fault(path, place, fmt.Sprintf("the lower limit on the %s is +Inf", what), "use -Inf for no lower limit")
		case math.IsInf(up, -1):
			v.fault(path, place, fmt.Sprintf("the upper limit on the %s is -Inf", what), "use +Inf for no upper limit")
		case lo > up:
			v.fault(path, place, fmt.Sprintf("the lower limit %g on the %s is above the upper limit %g", lo, what, up), "exchange or correct them")
		}
	}
	if !isReal {
		check("real part", real(lower), real(upper))
		check("imaginary part", imag(lower), imag(upper))
		return
	}
	check("value", real(lower), real(upper))
	if lo, up := imag(lower), imag(upper); (lo != 0 && !math.IsInf(lo, -1)) || (up != 0 && !math.IsInf(up, 1)) {
		v.fault(path, place, "a real number has limits on its imaginary part", "leave the imaginary part of its limits zero")
	}
}

// rounding reports whether the imaginary part of what should be real is small enough to come from the arithmetic that
// made it, as in U A U^H computed in floating point. Such parts are ignored.
func rounding(x complex128) bool {
	const share = 1e-12
	return math.Abs(imag(x)) <= share*(1+math.Abs(real(x)))
}

// find gives the block of a column and the entry in it.
func (v *validator) find(col uint32) (block, entry int) {
	block = blockOf(v.starts, col)
	return block, int(col) - v.starts[block]
}

func (v *validator) realColumn(col uint32) bool {
	b, k := v.find(col)
	return v.m.Blocks[b].RealEntry(k)
}

func (v *validator) entryName(col uint32) string {
	b, k := v.find(col)
	return fmt.Sprintf("entry %d of %s", k, Title("block", b, v.m.Blocks[b].Name))
}

func isFinite(c complex128) bool {
	return !math.IsNaN(real(c)-real(c)) && !math.IsNaN(imag(c)-imag(c)) // Inf - Inf is NaN
}

func (v *validator) objective() {
	o := &v.m.Objective
	const path, place = "objective", "the objective"
	if o.Sense > Maximize {
		v.fault(path+".sense", place, fmt.Sprintf("sense number %d is unknown", o.Sense), "use minimize or maximize")
	}
	if !isFinite(complex(o.Const, 0)) {
		v.fault(path+".constant", place, fmt.Sprintf("its constant is %g", o.Const), "send a finite number")
	}
	if len(o.Col) != len(o.Coef) {
		v.fault(path, place, fmt.Sprintf("it has %d columns and %d coefficients", len(o.Col), len(o.Coef)), "give one coefficient per column")
		return
	}
	for k, c := range o.Col {
		if !v.column(path, place, o.Col, k, 0) {
			return
		}
		v.coefficient(path, place, c, o.Coef[k], true)
	}
}

// column checks position k of a row's columns, which begin at position from.
func (v *validator) column(path, place string, cols []uint32, k, from int) bool {
	n := v.starts[len(v.m.Blocks)]
	if int64(cols[k]) >= int64(n) {
		v.fault(path, place, fmt.Sprintf("column %d does not exist; the model has %d entries", cols[k], n), "number entries through the blocks in order, from 0")
		return false
	}
	if k > from && cols[k] <= cols[k-1] {
		v.fault(path, place, fmt.Sprintf("column %d follows column %d", cols[k], cols[k-1]), "sort the columns of a row and add up those that repeat")
		return false
	}
	return true
}

func (v *validator) coefficient(path, place string, col uint32, x complex128, realSum bool) {
	if !isFinite(x) {
		v.fault(path, place, fmt.Sprintf("the coefficient on %s is %v", v.entryName(col), x), "send finite numbers")
		return
	}
	if realSum && !rounding(x) && v.realColumn(col) {
		v.fault(path, place, fmt.Sprintf("the coefficient %v on %s has an imaginary part, but the entry and the sum are real", x, v.entryName(col)),
			"make the coefficient real")
	}
}
