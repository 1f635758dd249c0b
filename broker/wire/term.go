package wire

import (
	"cmp"
	"fmt"
	"slices"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"
)

// term is one decoded coefficient.
type term struct {
	row  int
	col  uint32
	conj bool
	c    complex128
}

// term decodes one coefficient of a map with the given rows; order is that of a matrix-valued map, 0 for others.
func (d *decoder) term(t *towpathv1.Term, rows, order int, path, place string) (out term, err error) {
	if out.row, err = rowOf(t.GetRow(), rows, order, path+".row", place); err != nil {
		return out, err
	}
	k, err := d.blockOf(t, path, place)
	if err != nil {
		return out, err
	}
	b := &d.m.Blocks[k]
	at, upper, err := entryOf(t.GetEntry(), b, model.Title("block", k, b.Name), path+".entry", place)
	if err != nil {
		return out, err
	}
	out.col = uint32(d.starts[k] + at)
	out.conj = t.GetConjugate() != upper && !b.RealEntry(at) // the upper triangle is the conjugate of the lower
	out.c = complex(t.GetRe(), t.GetIm())
	return out, nil
}

func rowOf(row []uint64, rows, order int, path, place string) (int, error) {
	switch {
	case len(row) == 0:
		return 0, nil
	case order == 0 && len(row) == 1:
		if row[0] >= uint64(rows) {
			return 0, fault(path, place, fmt.Sprintf("row %d does not exist, there are %d", row[0], rows), "count rows from 0")
		}
		return int(row[0]), nil
	case order > 0 && len(row) == 2:
		i, j := row[0], row[1]
		if i >= uint64(order) || j >= uint64(order) {
			return 0, fault(path, place, fmt.Sprintf("row (%d, %d) does not exist, the order is %d", i, j, order), "count rows and columns from 0")
		}
		if i < j {
			return 0, fault(path, place, fmt.Sprintf("row (%d, %d) is above the diagonal", i, j), "give the lower triangle only; the upper one follows from it")
		}
		return model.PackedIndex(order, int(i), int(j)), nil
	case order > 0:
		return 0, fault(path, place, fmt.Sprintf("the place of a row in a matrix has %d numbers", len(row)), "give its row and its column")
	}
	return 0, fault(path, place, fmt.Sprintf("the place of a row has %d numbers", len(row)), "give one number")
}

func (d *decoder) blockOf(t *towpathv1.Term, path, place string) (int, error) {
	switch of := t.GetOf().(type) {
	case *towpathv1.Term_Block:
		if k, ok := d.number[of.Block]; ok && of.Block != "" {
			return k, nil
		}
		return 0, fault(path+".block", place, fmt.Sprintf("there is no block '%s'", of.Block), "use the name of a block, or block_number")
	case *towpathv1.Term_BlockNumber:
		if int64(of.BlockNumber) < int64(len(d.m.Blocks)) {
			return int(of.BlockNumber), nil
		}
		return 0, fault(path+".block_number", place, fmt.Sprintf("there is no block %d, there are %d", of.BlockNumber, len(d.m.Blocks)), "count blocks from 0")
	}
	return 0, fault(path+".block", place, "a coefficient names no block", "give block or block_number")
}

// entryOf finds an entry of a block; upper says that its mirror image in the upper triangle was named.
func entryOf(entry []uint64, b *model.Block, title, path, place string) (at int, upper bool, err error) {
	switch len(entry) {
	case 0:
		return 0, false, nil
	case 1:
		if entry[0] >= uint64(b.Entries()) {
			return 0, false, fault(path, place, fmt.Sprintf("entry %d of %s does not exist, there are %d", entry[0], title, b.Entries()), "count entries from 0")
		}
		return int(entry[0]), false, nil
	case 2:
		i, j := entry[0], entry[1]
		if i >= uint64(b.Rows) || j >= uint64(b.Cols) {
			return 0, false, fault(path, place, fmt.Sprintf("entry (%d, %d) of %s does not exist, its shape is %d x %d", i, j, title, b.Rows, b.Cols), "count rows and columns from 0")
		}
		switch {
		case !b.Field.IsMatrix():
			return int(j)*b.Rows + int(i), false, nil
		case i >= j:
			return model.PackedIndex(b.Rows, int(i), int(j)), false, nil
		}
		return model.PackedIndex(b.Rows, int(j), int(i)), true, nil
	}
	return 0, false, fault(path, place, fmt.Sprintf("the place of an entry has %d numbers", len(entry)), "give one number, or row and column")
}

// gather makes compressed rows of the terms on entries, or of those on conjugates. Terms on the same entry add up.
func gather(terms []term, rows int, conj bool) model.Matrix {
	slices.SortStableFunc(terms, func(a, b term) int { return cmp.Or(cmp.Compare(a.row, b.row), cmp.Compare(a.col, b.col)) })
	m := model.Matrix{Start: make([]int, rows+1)}
	var z []complex128
	isReal := true
	last := term{row: -1}
	for _, t := range terms {
		if t.conj != conj {
			continue
		}
		isReal = isReal && imag(t.c) == 0
		if t.row == last.row && t.col == last.col {
			z[len(z)-1] += t.c
			continue
		}
		m.Col, z = append(m.Col, t.col), append(z, t.c)
		m.Start[t.row+1]++
		last = t
	}
	for r := range rows {
		m.Start[r+1] += m.Start[r]
	}
	if !isReal {
		m.Z = z
		return m
	}
	m.Re = make([]float64, len(z))
	for i, v := range z {
		m.Re[i] = real(v)
	}
	return m
}
