package exchange

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"towpath/model"
)

// ReadSDPA reads a semidefinite program in SDPA sparse form (K. Fujisawa, M. Kojima, K. Nakata, M. Yamashita, SDPA user's
// manual; from memory):
//
//	minimize    c_1 x_1 + ... + c_m x_m
//	subject to  x_1 F_1 + ... + x_m F_m - F_0  positive semidefinite, block by block
//
// The model has one free real block x of m entries and one constraint per block of the file, "block 1" and so on: a
// symmetric psd map of the block's order, or, where the size is negative (a diagonal block), a nonneg map. The
// multiplier of a constraint is the block of the dual matrix Y of that form: F_i . Y = c_i, maximize F_0 . Y.
//
// A file is: comment lines beginning with " or *, then m, the number of blocks, the sizes of the blocks, the m numbers
// of c, and entries "matrix block row column value", counted from 1, matrix 0 being F_0. Commas, braces and parentheses
// count as blanks; after each of the four leading items the rest of the line is a remark. An entry stands
// for its mirror image too; giving an entry twice, or both of the pair, is a fault, because programs disagree on it.
func ReadSDPA(r io.Reader) (*model.Model, error) {
	return readSDPA(r, MaxRows)
}

func readSDPA(r io.Reader, most int) (*model.Model, error) {
	s := &sdpa{in: newLines(r), most: most}
	if err := s.head(); err != nil {
		return nil, err
	}
	if err := s.entries(); err != nil {
		return nil, err
	}
	return s.model()
}

// sdpa is a file being read.
type sdpa struct {
	in      *lines
	most    int // rows
	cost    []float64
	sizes   []int // negative for diagonal blocks
	entered [][]sdpaEntry
}

// sdpaEntry is a coefficient of row r of a block's map on x_i; matrix 0 is F_0.
type sdpaEntry struct {
	row, matrix int
	value       float64
	line        int
}

// sdpaWords splits a line of the file.
func sdpaWords(line string) []string {
	return strings.FieldsFunc(line, func(r rune) bool {
		return strings.ContainsRune(" \t\r,(){}", r)
	})
}

// head reads everything before the entries.
func (s *sdpa) head() error {
	m, err := s.count("the number of variables")
	if err != nil {
		return err
	}
	blocks, err := s.count("the number of blocks")
	if err != nil {
		return err
	}
	rows := 0
	err = s.list(blocks, "block sizes", func(line int, word string) error {
		n, err := integer(line, word)
		if err != nil {
			return err
		}
		order := max(n, -n)
		switch {
		case n == 0:
			return fault(line, fmt.Sprintf("block %d has size 0", len(s.sizes)+1), "leave it out")
		case n > model.MaxOrder:
			return fault(line, fmt.Sprintf("block %d has order %d, the largest is %d", len(s.sizes)+1, n, model.MaxOrder), "split the block")
		case n > 0:
			order = model.PackedLen(n)
		}
		if rows += order; rows > s.most {
			return fault(line, fmt.Sprintf("the blocks have more than %d entries in their lower triangles", s.most), "split the model")
		}
		s.sizes = append(s.sizes, n)
		return nil
	})
	if err != nil {
		return err
	}
	s.entered = make([][]sdpaEntry, blocks)
	return s.list(m, "objective coefficients", func(line int, word string) error {
		x, err := number(line, word)
		s.cost = append(s.cost, x)
		return err
	})
}

// count reads a line that begins with a positive number, after comments.
func (s *sdpa) count(what string) (int, error) {
	for {
		line, err := s.in.next()
		if err == io.EOF {
			return 0, fault(0, "it ends before "+what, "see whether it was cut off")
		}
		if err != nil {
			return 0, err
		}
		words := sdpaWords(line)
		if len(words) == 0 || strings.HasPrefix(line, "\"") || strings.HasPrefix(line, "*") {
			continue
		}
		n, err := integer(s.in.number, leadingNumber(words[0]))
		if err != nil {
			return 0, err
		}
		if n < 1 || n > s.most {
			return 0, fault(s.in.number, fmt.Sprintf("%s is %d", what, n), fmt.Sprintf("it lies between 1 and %d", s.most))
		}
		return n, nil
	}
}

// leadingNumber cuts a remark that is glued to a number, as in 3=mDIM.
func leadingNumber(word string) string {
	if cut := strings.IndexByte(word, '='); cut > 0 {
		return word[:cut]
	}
	return word
}

// list reads n words, over several lines if need be.
func (s *sdpa) list(n int, what string, take func(line int, word string) error) error {
	for have := 0; have < n; {
		line, err := s.in.next()
		if err == io.EOF {
			return fault(0, fmt.Sprintf("it ends after %d of %d %s", have, n, what), "see whether it was cut off")
		}
		if err != nil {
			return err
		}
		for _, word := range sdpaWords(line) {
			if have == n { // a remark, unless it is one number too many
				if _, err := number(s.in.number, word); err == nil {
					return fault(s.in.number, fmt.Sprintf("more than %d %s", n, what), "correct the number of them, or take the rest away")
				}
				break
			}
			if err := take(s.in.number, word); err != nil {
				return err
			}
			have++
		}
	}
	return nil
}

func (s *sdpa) entries() error {
	for {
		line, err := s.in.next()
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return err
		}
		words := sdpaWords(line)
		for ; len(words) >= 5; words = words[5:] {
			if err := s.entry(words); err != nil {
				return err
			}
		}
		if len(words) > 0 {
			return fault(s.in.number, fmt.Sprintf("an entry of %d words", len(words)), "write matrix, block, row, column and value")
		}
	}
}

// entry takes five words.
func (s *sdpa) entry(words []string) error {
	at := s.in.number
	var index [4]int
	for k := range index {
		var err error
		if index[k], err = integer(at, words[k]); err != nil {
			return err
		}
	}
	value, err := number(at, words[4])
	if err != nil {
		return err
	}
	matrix, block, i, j := index[0], index[1], index[2]-1, index[3]-1
	if matrix < 0 || matrix > len(s.cost) {
		return fault(at, fmt.Sprintf("matrix %d does not exist", matrix), fmt.Sprintf("the file has matrices 0 to %d", len(s.cost)))
	}
	if block < 1 || block > len(s.sizes) {
		return fault(at, fmt.Sprintf("block %d does not exist", block), fmt.Sprintf("the file has blocks 1 to %d", len(s.sizes)))
	}
	size := s.sizes[block-1]
	if order := max(size, -size); i < 0 || i >= order || j < 0 || j >= order {
		return fault(at, fmt.Sprintf("row %d, column %d lies outside block %d", i+1, j+1, block), fmt.Sprintf("rows and columns run from 1 to %d", order))
	}
	row := i
	switch {
	case size > 0:
		row = model.PackedIndex(size, max(i, j), min(i, j))
	case i != j:
		return fault(at, fmt.Sprintf("row %d, column %d is off the diagonal of block %d, which is diagonal", i+1, j+1, block), "give the block a positive size")
	}
	s.entered[block-1] = append(s.entered[block-1], sdpaEntry{row, matrix, value, at})
	return nil
}

// model makes the constraints, now that all is read.
func (s *sdpa) model() (*model.Model, error) {
	m := &model.Model{Blocks: []model.Block{{Name: "x", Field: model.Real, Rows: len(s.cost), Cols: 1}}}
	for i, c := range s.cost {
		if c != 0 {
			m.Objective.Col = append(m.Objective.Col, uint32(i))
			m.Objective.Coef = append(m.Objective.Coef, complex(c, 0))
		}
	}
	for b, size := range s.sizes {
		c := model.Constraint{Name: fmt.Sprintf("block %d", b+1)}
		rows := -size
		c.Map.Field, c.Cone.Kind = model.Real, model.Nonneg
		if size > 0 {
			rows = model.PackedLen(size)
			c.Map.Field, c.Cone.Kind = model.Symmetric, model.PSD
		}
		if err := fill(&c.Map, rows, s.entered[b]); err != nil {
			return nil, err
		}
		s.entered[b] = nil
		m.Constraints = append(m.Constraints, c)
	}
	return m, nil
}

// fill writes the entries of one block as a map: sum x_i F_i - F_0.
func fill(f *model.Map, rows int, entered []sdpaEntry) error {
	slices.SortStableFunc(entered, func(a, b sdpaEntry) int {
		if a.row != b.row {
			return a.row - b.row
		}
		return a.matrix - b.matrix
	})
	f.Lin.Start = make([]int, rows+1)
	for k, e := range entered {
		if k > 0 && entered[k-1].row == e.row && entered[k-1].matrix == e.matrix {
			return fault(e.line, fmt.Sprintf("this entry, or its mirror image, was given in line %d", entered[k-1].line), "give each pair of mirrored entries once")
		}
		switch {
		case e.value == 0:
		case e.matrix == 0:
			if f.Const == nil {
				f.Const = make([]complex128, rows)
			}
			f.Const[e.row] = complex(-e.value, 0)
		default:
			f.Lin.Start[e.row+1]++
			f.Lin.Col = append(f.Lin.Col, uint32(e.matrix-1))
			f.Lin.Re = append(f.Lin.Re, e.value)
		}
	}
	for r := range rows {
		f.Lin.Start[r+1] += f.Lin.Start[r]
	}
	return nil
}
