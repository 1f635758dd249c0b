// Package glpk drives glpsol, the linear programming program of GLPK, as a child process, over free MPS files.
//
// It takes real columns, free or nonneg and bounded, and real rows: equalities, inequalities and ranges. The simplex method
// ends at a vertex, so points are sharp where interior-point ones are not. glpsol leaves no certificate when a program is
// infeasible or unbounded; the driver then asks it a second, always solvable program whose solution is one (certificate.go).
package glpk

import (
	"context"
	"fmt"
	"math"
	"os/exec"
	"regexp"
	"strconv"
	"time"

	"towpath/backends"
	"towpath/backends/child"
	"towpath/capability"
	"towpath/model"
)

const (
	// Sheet is the name of the one sheet.
	Sheet = "glpk/lp"
	// Package is the Debian package that has the program.
	Package = "glpk-utils"
)

// Driver runs one glpsol program.
type Driver struct {
	path    string
	version string
}

// Find looks for the program.
func Find() (path string, ok bool) {
	path, err := exec.LookPath("glpsol")
	return path, err == nil
}

// New drives the program at a path.
func New(path string) *Driver { return &Driver{path: path, version: version(path)} }

func version(path string) string {
	ctx, cancel := context.WithTimeout(context.Background(), 5*time.Second)
	defer cancel()
	if r, err := child.Run(ctx, child.Command{Path: path, Args: []string{"--version"}}); err == nil {
		if m := regexp.MustCompile(`Solver,? v?(\d[\w.]*)`).FindStringSubmatch(r.Output); m != nil {
			return m[1]
		}
	}
	return "unknown"
}

// Sheets implements backends.Driver.
func (d *Driver) Sheets() []capability.Sheet {
	takes := map[capability.Kind]int{}
	for _, c := range []model.ConeKind{model.Free, model.Nonneg} {
		takes[capability.Kind{Place: capability.OnBlock, Field: model.Real, Cone: c}] = 0
	}
	takes[capability.Kind{Place: capability.OnBounds, Field: model.Real, Cone: model.Box}] = 0
	for _, c := range []model.ConeKind{model.Zero, model.Nonneg, model.Range} {
		takes[capability.Kind{Place: capability.OnMap, Field: model.Real, Cone: c}] = 0
	}
	return []capability.Sheet{{
		Backend: "glpk", Version: d.version, Name: Sheet, Takes: takes, Returns: capability.LiftsAll, Accuracy: 1e-7, Toll: toll,
	}}
}

// toll counts rows, columns and pivots. perPivot comes from one measured program of 800 rows and 1500 columns, which took
// 2.1 s; the rest are estimates.
func toll(l capability.Load) capability.Toll {
	const (
		start    = 5e-3    // seconds to start and read
		perPivot = 7.6e-10 // seconds per row, column and pivot, of which there are about rows + columns
		perSize  = 1e-6    // seconds to write and read a row or column
	)
	var rows, columns float64
	for _, d := range l {
		switch d.Kind.Place {
		case capability.OnMap:
			rows += float64(d.Size * d.Count)
		case capability.OnBlock:
			columns += float64(d.Size * d.Count)
		}
	}
	return capability.Toll{Seconds: start + perSize*(rows+columns) + perPivot*rows*columns*(rows+columns), Bytes: 5e6 + 1000*(rows+columns)}
}

// Solve implements backends.Driver. MaxIterations is not used: glpsol has no such limit.
func (d *Driver) Solve(ctx context.Context, sheet string, m *model.Model, o backends.Options) (*model.Answer, error) {
	if sheet != Sheet {
		return nil, fmt.Errorf("glpk has no sheet %q", sheet)
	}
	p, err := fromModel(m)
	if err != nil {
		return nil, err
	}
	s, err := d.run(ctx, p, o)
	if err != nil {
		return nil, err
	}
	a := &model.Answer{Objective: math.NaN(), Bound: math.NaN()}
	if s == nil {
		a.Outcome, a.Note = model.Stopped, "stopped; glpsol leaves no point when it is"
		return a, nil
	}
	a.Iterations, a.Note = s.pivots, "glpsol: "+s.words
	switch {
	case s.optimal():
		a.Outcome = model.Optimal
		a.Point, a.Multipliers = p.point(s.columns), p.multipliers(s.rowDuals, s.columnDuals)
		a.Objective, a.Bound = m.ObjectiveAt(a.Point), p.dualObjective(s)
	case s.primal == 'n':
		err = d.explain(ctx, p, a, o, (*program).elastic, p.farkas)
	case s.primal == 'f' && s.dual == 'n':
		err = d.explain(ctx, p, a, o, (*program).recession, p.ray)
	default:
		a.Outcome = model.Inaccurate
		a.Point = p.point(s.columns)
		a.Objective = m.ObjectiveAt(a.Point)
	}
	return a, err
}

// patience is how long a program may take in rational arithmetic.
const patience = 10 * time.Second

// explain solves the second program and takes a certificate from it.
func (d *Driver) explain(ctx context.Context, p *program, a *model.Answer, o backends.Options, second func(*program) *program, take func(*solution, *model.Answer) float64) error {
	q := second(p)
	s, err := d.run(ctx, q, o)
	if err != nil {
		return err
	}
	if s == nil {
		a.Outcome = model.Stopped
		return nil
	}
	a.Iterations += s.pivots
	a.Outcome = model.Inaccurate // unless a certificate is found
	off := math.Inf(1)
	if s.optimal() {
		off = take(s, a)
	}
	if off <= 1e-8 {
		return nil
	}
	// glpsol's rational arithmetic gives more digits, but is wrong at times: what it says is taken only when it is better.
	short, cancel := context.WithTimeout(ctx, patience)
	defer cancel()
	if s, err := d.run(short, q, o, "--exact"); err == nil && s != nil && s.optimal() {
		exact := *a
		if take(s, &exact) < off {
			*a = exact
		}
	}
	return nil
}

// run solves one program; nil without an error means that ctx ended.
func (d *Driver) run(ctx context.Context, p *program, o backends.Options, more ...string) (*solution, error) {
	c := child.Command{
		Path: d.path, Read: []string{"out"}, MaxMemory: o.MaxMemory,
		// With the presolver on, which is the default, infeasible and unbounded programs come back undefined.
		Args:  append([]string{"--freemps", "in.mps", "--nopresol", "-w", "out"}, more...),
		Files: map[string][]byte{"in.mps": p.text()},
	}
	pivots, began := 0, time.Now()
	c.Line = func(line string) {
		q, ok := progress(line)
		if !ok {
			return
		}
		pivots = q.Iteration
		if o.Progress != nil {
			q.Primal, q.Elapsed = q.Primal+p.constant, time.Since(began)
			o.Progress(q)
		}
	}
	r, err := child.Run(ctx, c)
	if ctx.Err() != nil {
		return nil, nil
	}
	if err != nil {
		return nil, fmt.Errorf("glpk: %w", err)
	}
	file, there := r.Files["out"]
	if !there {
		return nil, fmt.Errorf("glpk: glpsol ended with code %d and no solution: %s", r.Code, tail(r.Output))
	}
	s, err := parse(file, len(p.rowLower), len(p.cost))
	if err != nil {
		return nil, fmt.Errorf("glpk: glpsol's solution file: %w", err)
	}
	s.columnDuals = p.reducedCosts(s.rowDuals)
	s.pivots, s.words = pivots, status(r.Output)
	return s, nil
}

var progressLine = regexp.MustCompile(`^[* ]\s*(\d+): obj =\s*(\S+) inf =\s*(\S+)`)

// progress reads glpsol's lines "*    12: obj =   3.500000000e+00 inf =   0.000e+00 (0)".
func progress(line string) (backends.Progress, bool) {
	f := progressLine.FindStringSubmatch(line)
	if f == nil {
		return backends.Progress{}, false
	}
	n, _ := strconv.Atoi(f[1]) // what cannot be read shows as 0
	objective, _ := strconv.ParseFloat(f[2], 64)
	residual, _ := strconv.ParseFloat(f[3], 64)
	nan := math.NaN()
	return backends.Progress{Iteration: n, Primal: objective, Dual: nan, Gap: nan, PrimalResidual: residual, DualResidual: nan, Step: nan}, true
}

var _ backends.Driver = (*Driver)(nil)
