package csdp

import (
	"errors"
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
	y, x, whole, err := p.parse(file)
	if err == nil && !whole && r.Code != xInfeasible { // where there is no X, none is used
		err = errors.New("it is cut short: the last entry of X is missing")
	}
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
				return strings.TrimSpace(strings.ToValidUTF8(l, "?"))
			}
		}
	}
	return "no status line"
}

func tail(s string) string {
	const most = 300
	s = strings.TrimSpace(strings.ToValidUTF8(s, "?")) // it goes into messages that must be text
	if len(s) > most {
		s = "..." + strings.ToValidUTF8(s[len(s)-most:], "")
	}
	return s
}
