// Package csdp drives the solver program csdp (Borchers 1999) as a child process, over SDPA sparse files.
//
// csdp solves the pair
//
//	max tr(C X)  s.t.  tr(A_i X) = a_i, X psd        min a'y  s.t.  sum_i y_i A_i - C = Z psd
//
// and both of its sides are a sheet: csdp/equality takes blocks in cones with equality rows (the left side),
// csdp/inequality takes free columns with matrix inequalities (the right side).
package csdp

import (
	"context"
	"fmt"
	"math"
	"os/exec"
	"regexp"
	"strconv"
	"strings"
	"time"

	"towpath/backends"
	"towpath/backends/child"
	"towpath/capability"
	"towpath/model"
)

// Names of the sheets.
const (
	EqualitySheet   = "csdp/equality"
	InequalitySheet = "csdp/inequality"
)

// Package is the Debian package that has the program.
const Package = "coinor-csdp"

// Driver runs one csdp program.
type Driver struct {
	path    string
	version string
}

// Find looks for the program.
func Find() (path string, ok bool) {
	path, err := exec.LookPath("csdp")
	return path, err == nil
}

// New drives the program at a path.
func New(path string) *Driver { return &Driver{path: path, version: version(path)} }

// version asks the program, which tells it in the first line of any run.
func version(path string) string {
	ctx, cancel := context.WithTimeout(context.Background(), 5*time.Second)
	defer cancel()
	r, err := child.Run(ctx, child.Command{Path: path, Args: []string{"in.dat-s", "out"}, Files: map[string][]byte{"in.dat-s": []byte("1\n1\n1\n1\n1 1 1 1 1\n")}})
	if err != nil {
		return "unknown"
	}
	if m := regexp.MustCompile(`CSDP (\d[\w.]*)`).FindStringSubmatch(r.Output); m != nil {
		return m[1]
	}
	return "unknown"
}

// Sheets implements backends.Driver.
func (d *Driver) Sheets() []capability.Sheet {
	kind := func(p capability.Place, f model.Field, c model.ConeKind) capability.Kind {
		return capability.Kind{Place: p, Field: f, Cone: c}
	}
	const b, m = capability.OnBlock, capability.OnMap
	zero, free := kind(m, model.Real, model.Zero), kind(b, model.Real, model.Free)
	sheet := capability.Sheet{Backend: "csdp", Version: d.version, Returns: capability.LiftsAll, Accuracy: 1e-8, Toll: toll}
	equality, inequality := sheet, sheet
	equality.Name, equality.Needs = EqualitySheet, []capability.Kind{zero}
	equality.Takes = map[capability.Kind]int{zero: 0, kind(b, model.Symmetric, model.PSD): 0, kind(b, model.Real, model.Nonneg): 0}
	inequality.Name, inequality.Needs = InequalitySheet, []capability.Kind{free}
	inequality.Takes = map[capability.Kind]int{free: 0, kind(m, model.Symmetric, model.PSD): 0, kind(m, model.Real, model.Nonneg): 0}
	return []capability.Sheet{equality, inequality}
}

// rates were estimates; for the same eleven programs of SDPLIB as the interior engine's, on the same machine, they came within
// a factor of 3.6 of what was measured (theta2 0.62 s predicted, 0.42 measured; arch0 0.89, 1.15; control2 0.014, 0.051).
var rates = capability.Rates{
	Start: 10e-3, Coefficient: 4e-7, Iterations: 16, Flops: 8e9,
	Matrix: 60, Scalar: 120, Product: 0, Entry: 40, Pair: 10,
	Bytes: 6e6, Copies: 1, Matrices: 12,
}

func toll(l capability.Load) capability.Toll { return capability.InteriorToll(l, rates) }

// Solve implements backends.Driver.
func (d *Driver) Solve(ctx context.Context, sheet string, m *model.Model, o backends.Options) (*model.Answer, error) {
	var p *problem
	var err error
	switch sheet {
	case EqualitySheet:
		p, err = fromEquality(m)
	case InequalitySheet:
		p, err = fromInequality(m)
	default:
		return nil, fmt.Errorf("csdp has no sheet %q", sheet)
	}
	if err != nil {
		return nil, err
	}
	if p.settled != nil {
		return p.settled, nil
	}
	c := child.Command{
		Path: d.path, Args: []string{"in.dat-s", "out"}, Read: []string{"out"}, MaxMemory: o.MaxMemory,
		Files: map[string][]byte{"in.dat-s": p.text(), "param.csdp": parameters(o, p)},
	}
	if o.Progress != nil {
		c.Line = progress(o.Progress, sheet == InequalitySheet, m.Objective.Const)
	}
	r, err := child.Run(ctx, c)
	if ctx.Err() != nil {
		return stopped("stopped; csdp leaves no point when it is"), nil
	}
	if err != nil {
		return nil, fmt.Errorf("csdp: %w", err)
	}
	return p.read(r)
}

func stopped(note string) *model.Answer {
	return &model.Answer{Outcome: model.Stopped, Objective: math.NaN(), Bound: math.NaN(), Note: note}
}

// defaultTolerance is csdp's own. Of the tolerances and settings of perturbobj tried on the published instances of
// broker/endtoend (1e-7 and 1e-8 with, 1e-8 and 1e-9 without), this one with perturbobj=1 left the fewest unchecked.
const defaultTolerance = 1e-8

// A certificate of csdp shows that every point is at least pinftol (dinftol) long. Its own setting, 1e8, lets it call
// min x, x >= 1e9 infeasible: the certificate 1e-9 misses by 1e-9. So the length asked for is at least beyond times the
// largest constant (cost) of the model. It is not more where shortest is enough, because csdp finds fewer certificates the
// longer it is.
const (
	shortest = 1e8
	beyond   = 1e3
)

// parameters writes param.csdp. perturbobj=1, csdp's default, helps where lowering left no interior.
func parameters(o backends.Options, p *problem) []byte {
	t, limit := o.Tolerance, o.MaxIterations
	if t == 0 {
		t = defaultTolerance
	}
	if limit == 0 {
		limit = 100
	}
	left, right := shortest, shortest
	for _, v := range p.a {
		left = max(left, beyond*math.Abs(v))
	}
	for _, b := range p.blocks {
		for _, e := range b.entries {
			if e.of == 0 {
				right = max(right, beyond*math.Abs(e.v))
			}
		}
	}
	return fmt.Appendf(nil, "axtol=%g\natytol=%g\nobjtol=%g\npinftol=%g\ndinftol=%g\nmaxiter=%d\nminstepfrac=0.90\nmaxstepfrac=0.97\nminstepp=1e-8\nminstepd=1e-8\nusexzgap=1\ntweakgap=0\naffine=0\nprintlevel=1\nperturbobj=1\nfastmode=0\n", t, t, t, left, right, limit)
}

// progress reads csdp's lines "Iter: 3 Ap: 1.00e+00 Pobj: 1.5e+01 Ad: 9.0e-01 Dobj: 1.6e+01".
func progress(tell func(backends.Progress), inequality bool, constant float64) func(string) {
	began := time.Now()
	pattern := regexp.MustCompile(`^Iter:\s*(\d+)\s+Ap:\s*(\S+)\s+Pobj:\s*(\S+)\s+Ad:\s*(\S+)\s+Dobj:\s*(\S+)`)
	return func(line string) {
		f := pattern.FindStringSubmatch(line)
		if f == nil {
			return
		}
		var v [6]float64
		for i := 1; i < 6; i++ {
			v[i], _ = strconv.ParseFloat(strings.TrimSpace(f[i]), 64) // what cannot be read shows as 0
		}
		primal, dual := -v[3], -v[5]
		if inequality {
			primal, dual = v[5], v[3]
		}
		tell(backends.Progress{
			Iteration: int(v[1]), Primal: primal + constant, Dual: dual + constant,
			Gap:            math.Abs(primal-dual) / (1 + math.Abs(primal) + math.Abs(dual)),
			PrimalResidual: math.NaN(), DualResidual: math.NaN(), Step: min(v[2], v[4]), Elapsed: time.Since(began),
		})
	}
}

var _ backends.Driver = (*Driver)(nil)
