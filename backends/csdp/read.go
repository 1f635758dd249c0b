package csdp

import (
	"bufio"
	"bytes"
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"

	"towpath/backends/child"
	"towpath/model"
)

// Exit codes of csdp that leave a solution file.
const (
	solved        = 0
	xInfeasible   = 1 // no X: the file has y with a'y = -1, sum y_i A_i psd
	yInfeasible   = 2 // no y: the file has X with tr(C X) = 1, tr(A_i X) = 0
	partly        = 3 // short of full accuracy
	iterationsOut = 4
	// 5 to 9 are kinds of being stuck
	lastStuck = 9
)

// read turns what csdp left into an answer.
func (p *problem) read(r *child.Result) (*model.Answer, error) {
	file, there := r.Files["out"]
	if r.Code < solved || r.Code > lastStuck || !there {
		return nil, fmt.Errorf("csdp ended with code %d and no solution: %s", r.Code, tail(r.Output))
	}
	y, x, err := p.parse(file)
	if err != nil {
		return nil, fmt.Errorf("csdp's solution file: %w", err)
	}
	a := &model.Answer{Objective: math.NaN(), Bound: math.NaN(), Iterations: lastIteration(r.Output), Note: "csdp: " + status(r.Output)}
	left, right := x, y // primal and dual of the left side
	switch r.Code {
	case xInfeasible:
		if p.inequality {
			a.Outcome, a.Ray = model.Unbounded, p.columns(right)
		} else {
			a.Outcome, a.Farkas = model.Infeasible, p.rows(right)
		}
		return a, nil
	case yInfeasible:
		if p.inequality {
			a.Outcome, a.Farkas = model.Infeasible, p.matrices(left)
		} else {
			a.Outcome, a.Ray = model.Unbounded, p.values(left)
		}
		return a, nil
	case solved:
		a.Outcome = model.Optimal
	default:
		a.Outcome = model.Inaccurate
	}
	cx, ay := p.trace(x), 0.0
	for i, v := range p.a {
		ay += v * y[i]
	}
	if p.inequality {
		a.Point, a.Multipliers = p.columns(right), p.matrices(left)
		a.Objective, a.Bound = ay+p.m.Objective.Const, cx+p.m.Objective.Const
	} else {
		a.Point, a.Multipliers = p.values(left), p.rows(right)
		a.Objective, a.Bound = -cx+p.m.Objective.Const, -ay+p.m.Objective.Const
	}
	return a, nil
}

// parse reads y in the first line, then lines "1 block i j value" for Z, which follows from y and is not kept, and
// "2 block i j value" for X, which comes back packed by block. Everything is checked: the file is not ours.
func (p *problem) parse(file []byte) (y []float64, x [][]float64, err error) {
	for _, b := range p.blocks {
		n := b.size
		if !b.diagonal {
			n = model.PackedLen(b.size)
		}
		x = append(x, make([]float64, n))
	}
	in := bufio.NewScanner(bytes.NewReader(file))
	in.Buffer(nil, len(file)+1)
	if !in.Scan() {
		return nil, nil, fmt.Errorf("it is empty")
	}
	for _, w := range strings.Fields(in.Text()) {
		v, err := number(w)
		if err != nil {
			return nil, nil, err
		}
		y = append(y, v)
	}
	if len(y) != len(p.a) {
		return nil, nil, fmt.Errorf("it has %d multipliers for %d rows", len(y), len(p.a))
	}
	for in.Scan() {
		f := strings.Fields(in.Text())
		if len(f) == 0 {
			continue
		}
		if len(f) != 5 {
			return nil, nil, fmt.Errorf("line %q does not have 5 fields", in.Text())
		}
		var n [4]int
		for i := range n {
			if n[i], err = strconv.Atoi(f[i]); err != nil {
				return nil, nil, err
			}
		}
		v, err := number(f[4])
		if err != nil {
			return nil, nil, err
		}
		which, k, i, j := n[0], n[1]-1, n[2], n[3]
		if i > j {
			i, j = j, i
		}
		if which < 1 || which > 2 || k < 0 || k >= len(p.blocks) || i < 1 || j > p.blocks[k].size || p.blocks[k].diagonal && i != j {
			return nil, nil, fmt.Errorf("line %q names no entry", in.Text())
		}
		at := i - 1
		if !p.blocks[k].diagonal {
			at = model.PackedIndex(p.blocks[k].size, j-1, i-1)
		}
		if which == 2 {
			x[k][at] = v
		}
	}
	return y, x, in.Err()
}

func number(w string) (float64, error) {
	v, err := strconv.ParseFloat(w, 64)
	if err == nil && math.IsNaN(v-v) {
		err = fmt.Errorf("%q is not finite", w)
	}
	return v, err
}

// trace is tr(C X).
func (p *problem) trace(x [][]float64) float64 {
	t := 0.0
	for k, b := range p.blocks {
		for _, e := range b.entries {
			if e.of != 0 {
				continue
			}
			at, twice := e.i-1, 1.0
			if !b.diagonal {
				at = model.PackedIndex(b.size, e.j-1, e.i-1)
			}
			if e.i != e.j {
				twice = 2
			}
			t += twice * e.v * x[k][at]
		}
	}
	return t
}

// values gives X to the blocks of an equality model.
func (p *problem) values(x [][]float64) *model.Point {
	out := p.noPoint()
	for k := range x {
		for i, v := range x[k] {
			out.Values[k][i] = complex(v, 0)
		}
	}
	return out
}

// rows gives -y to the rows of an equality model.
func (p *problem) rows(y []float64) *model.Multipliers {
	out := p.noMultipliers()
	p.spread(out.Constraints, y, -1)
	return out
}

// columns gives y to the entries of an inequality model.
func (p *problem) columns(y []float64) *model.Point {
	out := p.noPoint()
	p.spread(out.Values, y, 1)
	return out
}

// spread writes times y to the places that have a row in the file.
func (p *problem) spread(into [][]complex128, y []float64, times float64) {
	n := 0
	for k := range into {
		for i := range into[k] {
			if at := p.where[n]; at >= 0 {
				into[k][i] = complex(times*y[at], 0)
			}
			n++
		}
	}
}

// matrices gives X to the constraints of an inequality model.
func (p *problem) matrices(x [][]float64) *model.Multipliers {
	out := p.noMultipliers()
	for k := range x {
		for i, v := range x[k] {
			out.Constraints[k][i] = complex(v, 0)
		}
	}
	return out
}

func lastIteration(output string) int {
	all := regexp.MustCompile(`(?m)^Iter:\s*(\d+)`).FindAllStringSubmatch(output, -1)
	if len(all) == 0 {
		return 0
	}
	n, _ := strconv.Atoi(all[len(all)-1][1]) // the pattern has digits only
	return n
}

// status is the sentence in which csdp says how it ended.
func status(output string) string {
	for _, l := range strings.Split(output, "\n") {
		for _, start := range []string{"Success:", "Partial Success:", "Failure:", "Stuck", "Lack of progress", "Maximum iterations"} {
			if strings.HasPrefix(l, start) {
				return strings.TrimSpace(l)
			}
		}
	}
	return "no status line"
}

func tail(s string) string {
	const most = 300
	s = strings.TrimSpace(s)
	if len(s) > most {
		s = "..." + s[len(s)-most:]
	}
	return s
}
