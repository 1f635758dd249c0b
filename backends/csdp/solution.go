package csdp

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"strconv"

	"towpath/model"
)

// parse reads y in the first line, then lines "1 block i j value" for Z, which follows from y and is not kept, and
// "2 block i j value" for X, which comes back packed by block. whole says whether the last entry of X was there: csdp
// leaves zeros out, but its X is positive definite and ends with a diagonal entry. Everything is checked: the file is not
// ours, and a full disk cuts it short without a word from csdp.
func (p *problem) parse(file []byte) (y []float64, x [][]float64, whole bool, err error) {
	fail := func(format string, a ...any) ([]float64, [][]float64, bool, error) {
		return nil, nil, false, fmt.Errorf(format, a...)
	}
	for _, b := range p.blocks {
		n := b.size
		if !b.diagonal {
			n = model.PackedLen(b.size)
		}
		x = append(x, make([]float64, n))
	}
	if len(file) == 0 {
		return fail("it is empty")
	}
	if file[len(file)-1] != '\n' {
		return fail("it ends within a line")
	}
	first := true
	for line := range bytes.Lines(file) {
		if first {
			if y, err = p.multipliers(line); err != nil {
				return fail("%w", err)
			}
			first = false
			continue
		}
		if len(bytes.TrimSpace(line)) == 0 {
			continue
		}
		which, k, at, v, err := p.entry(line)
		if err != nil {
			return fail("line %q %w", clip(line), err)
		}
		if which == 2 {
			x[k][at] = v
			whole = whole || k == len(x)-1 && at == len(x[k])-1 && v != 0
		}
	}
	return y, x, whole, nil
}

// multipliers reads the first line, one number for every row.
func (p *problem) multipliers(line []byte) ([]float64, error) {
	y := make([]float64, 0, len(p.a))
	for w := range bytes.FieldsSeq(line) {
		if len(y) == len(p.a) {
			return nil, fmt.Errorf("it has more than %d multipliers for %d rows", len(y), len(p.a))
		}
		v, err := number(w)
		if err != nil {
			return nil, err
		}
		y = append(y, v)
	}
	if len(y) != len(p.a) {
		return nil, fmt.Errorf("it has %d multipliers for %d rows", len(y), len(p.a))
	}
	return y, nil
}

// entry reads "which block i j value": which is 1 for Z and 2 for X, at the packed position in the block.
func (p *problem) entry(line []byte) (which, k, at int, v float64, err error) {
	var word [5][]byte
	n := 0
	for w := range bytes.FieldsSeq(line) {
		if n == len(word) {
			n++
			break
		}
		word[n] = w
		n++
	}
	if n != len(word) {
		return 0, 0, 0, 0, errors.New("does not have 5 fields")
	}
	var whole [4]int
	for i := range whole {
		if whole[i], err = strconv.Atoi(string(clip(word[i]))); err != nil {
			return 0, 0, 0, 0, errors.New("does not begin with four whole numbers")
		}
	}
	if v, err = number(word[4]); err != nil {
		return 0, 0, 0, 0, fmt.Errorf("has a value that cannot be: %w", err)
	}
	which, k = whole[0], whole[1]-1
	i, j := min(whole[2], whole[3]), max(whole[2], whole[3])
	if which < 1 || which > 2 || k < 0 || k >= len(p.blocks) || i < 1 || j > p.blocks[k].size || p.blocks[k].diagonal && i != j {
		return 0, 0, 0, 0, errors.New("names no entry")
	}
	if p.blocks[k].diagonal {
		return which, k, i - 1, v, nil
	}
	return which, k, model.PackedIndex(p.blocks[k].size, j-1, i-1), v, nil
}

func number(w []byte) (float64, error) {
	v, err := strconv.ParseFloat(string(clip(w)), 64)
	if err != nil {
		return 0, fmt.Errorf("%q is not a number in range", clip(w))
	}
	if math.IsNaN(v - v) {
		return 0, fmt.Errorf("%q is not finite", w)
	}
	return v, nil
}

// clip shortens what is said of a line or word: a file gone wrong may be one long line.
func clip(w []byte) []byte {
	const most = 100
	w = bytes.TrimSpace(w)
	if len(w) > most {
		return append(w[:most:most], "..."...)
	}
	return w
}
