package exchange

import (
	"fmt"
	"io"
	"strings"

	"towpath/model"
)

// ReadMPS reads a linear program in free MPS: words separated by blanks, so that names have none in them. Files in fixed
// columns are read too as long as their names have no blanks. Common practice, no source:
//
//   - sections NAME, OBJSENSE (MAX or MIN, on the same line or the next), ROWS, COLUMNS, RHS, RANGES, BOUNDS, ENDATA;
//     a * in the first column begins a comment;
//   - the first N row is the objective, further N rows are left out; minus its right-hand side is the objective's constant;
//   - a range R turns a row into an interval: [b, b+|R|] for G, [b-|R|, b] for L, and for E [b, b+R] or [b+R, b],
//     whichever way R points;
//   - a column lies in [0, inf) unless BOUNDS says otherwise: LO, UP, FX, FR, MI, PL; 1e30 and more is infinite.
//
// Where programs disagree the file is refused: a negative UP bound without a lower one, an entry given twice, a second set
// of right-hand sides, ranges or bounds. Integer columns are refused as well: no back end here takes them.
//
// The model has one real block of one entry per column and one constraint per row, with the names of the file; the file's
// name becomes the model's. Equality rows are zero maps row - b, inequalities nonneg maps, intervals range maps. A
// multiplier of an L row thus belongs to b - row >= 0.
func ReadMPS(r io.Reader) (*model.Model, error) {
	p := &mps{in: newLines(r), rowOf: map[string]int{}, columnOf: map[string]int{}}
	if err := p.read(); err != nil {
		return nil, err
	}
	return p.model()
}

// mps is a file being read.
type mps struct {
	in        *lines
	name      string
	sense     model.Sense
	rows      []mpsRow
	rowOf     map[string]int
	objective int // place of the first N row; rows are never that many when there is none
	columns   []mpsColumn
	columnOf  map[string]int
	sets      [3]string // names of the one set of RHS, RANGES and BOUNDS
	hasSet    [3]bool
}

type mpsRow struct {
	name     string
	kind     byte // N, E, L or G
	entries  []mpsEntry
	rhs      float64
	rhsLine  int // 0: not given
	spread   float64
	rangeSet int // line, 0: none
}

type mpsEntry struct {
	column int
	value  float64
}

type mpsColumn struct {
	name         string
	lower, upper float64
	loLine       int // where a bound was stated last, 0: nowhere
	upLine       int
	rows         map[int]int // line of each row's entry, while the column is being read
}

// section numbers of the sets
const (
	rhsSet = iota
	rangeSet
	boundSet
)

// read walks the sections.
func (p *mps) read() error {
	p.objective = -1
	section := ""
	for {
		text, err := p.in.next()
		if err == io.EOF {
			return fault(0, "it ends without ENDATA", "see whether it was cut off")
		}
		if err != nil {
			return err
		}
		words := strings.Fields(text)
		if len(words) == 0 || text[0] == '*' {
			continue
		}
		if text[0] != ' ' && text[0] != '\t' {
			if section, err = p.begin(words); err != nil {
				return err
			}
			if section == "ENDATA" {
				return nil
			}
			continue
		}
		switch section {
		case "OBJSENSE":
			err = p.direction(words)
		case "ROWS":
			err = p.row(words)
		case "COLUMNS":
			err = p.column(words)
		case "RHS":
			err = p.rhs(words)
		case "RANGES":
			err = p.ranges(words)
		case "BOUNDS":
			err = p.bound(words)
		default:
			err = p.fault("data outside a section", "begin with NAME or ROWS")
		}
		if err != nil {
			return err
		}
	}
}

// begin opens a section.
func (p *mps) begin(words []string) (string, error) {
	switch words[0] {
	case "NAME":
		p.name = strings.Join(words[1:], " ")
	case "OBJSENSE":
		if len(words) > 1 {
			return "OBJSENSE", p.direction(words[1:])
		}
	case "ROWS", "COLUMNS", "RHS", "RANGES", "BOUNDS", "ENDATA":
	default:
		return "", p.fault(fmt.Sprintf("section %s is unknown", clip(words[0])), "linear programs have NAME, OBJSENSE, ROWS, COLUMNS, RHS, RANGES, BOUNDS and ENDATA; indent data lines")
	}
	return words[0], nil
}

func (p *mps) fault(problem, cure string) error { return fault(p.in.number, problem, cure) }

func (p *mps) direction(words []string) error {
	switch strings.ToUpper(words[0]) {
	case "MAX", "MAXIMIZE":
		p.sense = model.Maximize
	case "MIN", "MINIMIZE":
		p.sense = model.Minimize
	default:
		return p.fault(fmt.Sprintf("sense %s is unknown", clip(words[0])), "write MAX or MIN")
	}
	return nil
}
