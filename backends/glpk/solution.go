package glpk

import (
	"bufio"
	"bytes"
	"fmt"
	"math"
	"strconv"
	"strings"

	"towpath/model"
)

// solution is what glpsol left, in its own numbering.
type solution struct {
	primal, dual          byte // f feasible, i infeasible, n there is none, u undefined
	rows, columns         []float64
	rowDuals              []float64
	columnDuals           []float64
	pivots                int
	words                 string
	haveRows, haveColumns int
}

func (s *solution) optimal() bool { return s.primal == 'f' && s.dual == 'f' }

// parse reads a basic solution: "s bas ROWS COLUMNS PRIMAL DUAL OBJECTIVE", then "i ROW STATE VALUE DUAL" and "j COLUMN
// STATE VALUE DUAL" for every row and column. Everything is checked: the file is not ours.
func parse(file []byte, rows, columns int) (*solution, error) {
	s := &solution{rows: make([]float64, rows), rowDuals: make([]float64, rows), columns: make([]float64, columns), columnDuals: make([]float64, columns)}
	in := bufio.NewScanner(bytes.NewReader(file))
	number, ended := 0, false
	for in.Scan() && !ended {
		number++
		w := strings.Fields(in.Text())
		if len(w) == 0 || w[0] == "c" {
			continue
		}
		var err error
		switch {
		case w[0] == "s" && len(w) == 7:
			err = s.head(w, rows, columns)
		case w[0] == "i" && len(w) == 5:
			err = entry(w, s.rows, s.rowDuals)
			s.haveRows++
		case w[0] == "j" && len(w) == 5:
			err = entry(w, s.columns, s.columnDuals)
			s.haveColumns++
		case w[0] == "e":
			ended = true
		default:
			err = fmt.Errorf("%d words that begin with %q", len(w), w[0])
		}
		if err != nil {
			return nil, fmt.Errorf("line %d: %w", number, err)
		}
	}
	if err := in.Err(); err != nil {
		return nil, err
	}
	if !ended || s.primal == 0 || s.haveRows != rows || s.haveColumns != columns {
		return nil, fmt.Errorf("it has %d of %d rows and %d of %d columns, end mark %t", s.haveRows, rows, s.haveColumns, columns, ended)
	}
	return s, nil
}

func (s *solution) head(w []string, rows, columns int) error {
	if w[1] != "bas" || w[2] != strconv.Itoa(rows) || w[3] != strconv.Itoa(columns) {
		return fmt.Errorf("a %s solution of %s rows and %s columns, not a bas of %d and %d", w[1], w[2], w[3], rows, columns)
	}
	if len(w[4]) != 1 || len(w[5]) != 1 || !strings.Contains("finu", w[4]) || !strings.Contains("finu", w[5]) {
		return fmt.Errorf("states %q and %q", w[4], w[5])
	}
	s.primal, s.dual = w[4][0], w[5][0]
	return nil
}

func entry(w []string, values, duals []float64) error {
	k, err := strconv.Atoi(w[1])
	if err != nil || k < 1 || k > len(values) {
		return fmt.Errorf("number %q of %d", w[1], len(values))
	}
	for i, to := range []*float64{&values[k-1], &duals[k-1]} {
		if *to, err = strconv.ParseFloat(w[3+i], 64); err != nil || math.IsInf(*to, 0) || math.IsNaN(*to) {
			return fmt.Errorf("%q is not a finite number", w[3+i])
		}
	}
	return nil
}

// point gives the values of the columns to the model's blocks.
func (p *program) point(columns []float64) *model.Point {
	out := &model.Point{}
	for b := range p.m.Blocks {
		v := make([]complex128, p.m.Blocks[b].Entries())
		for k := range v {
			v[k] = complex(columns[k], 0)
		}
		columns = columns[len(v):]
		out.Values = append(out.Values, v)
	}
	return out
}

// multipliers gives duals to the model's rows and bounds. The reduced cost of a column is the multiplier of its bounds,
// or, where it is the lower bound zero of a nonneg block that pushes, of the block's cone, which is not stored.
func (p *program) multipliers(rowDuals, columnDuals []float64) *model.Multipliers {
	out := &model.Multipliers{}
	row := 0
	for k := range p.m.Constraints {
		y := make([]complex128, p.m.Constraints[k].Map.Rows())
		for r := range y {
			if at := p.place[row]; at >= 0 {
				y[r] = complex(rowDuals[at], 0)
			}
			row++
		}
		out.Constraints = append(out.Constraints, y)
	}
	column := 0
	for b := range p.m.Blocks {
		blk := &p.m.Blocks[b]
		var z []complex128
		if blk.Bounds != nil {
			z = make([]complex128, blk.Entries())
			for k := range z {
				d := columnDuals[column+k]
				if ofCone := blk.Cone == model.Nonneg && real(blk.Bounds.Lower[k]) < 0; d < 0 || !ofCone {
					z[k] = complex(d, 0)
				}
			}
		}
		column += blk.Entries()
		out.Bounds = append(out.Bounds, z)
	}
	return out
}

// reducedCosts is cost - A^T y. glpsol prints reduced costs too, but each rounded on its own, and a certificate lives of
// their agreement with the row duals.
func (p *program) reducedCosts(y []float64) []float64 {
	d := append([]float64(nil), p.cost...)
	for r, v := range y {
		for q := p.start[r]; q < p.start[r+1]; q++ {
			d[p.column[q]] -= v * p.value[q]
		}
	}
	return d
}

// dualObjective is the constant plus what rows and bounds push.
func (p *program) dualObjective(s *solution) float64 {
	return p.constant + pushes(s.rowDuals, p.rowLower, p.rowUpper) + pushes(s.columnDuals, p.lower, p.upper)
}

// pushes is the sum of dual times limit: the lower limit for positive duals, the upper for negative ones. Where that limit
// is infinite the dual is a rounding error, and belongs to the other limit if there is one.
func pushes(duals, lower, upper []float64) float64 {
	sum := 0.0
	for k, d := range duals {
		limit, other := lower[k], upper[k]
		if d < 0 {
			limit, other = other, limit
		}
		if math.IsInf(limit, 0) {
			limit = other
		}
		if !math.IsInf(limit, 0) {
			sum += d * limit
		}
	}
	return sum
}

// status finds glpsol's own words for how it ended.
func status(output string) string {
	for line := range strings.Lines(output) {
		line = strings.TrimSpace(line)
		if line != "" && line == strings.ToUpper(line) && strings.Contains(line, "SOLUTION") {
			return line
		}
	}
	return "no words"
}

// tail is the end of an output, for messages.
func tail(output string) string {
	const most = 300
	output = strings.TrimSpace(output)
	if len(output) > most {
		output = "..." + output[len(output)-most:]
	}
	return strings.ToValidUTF8(output, "?")
}
