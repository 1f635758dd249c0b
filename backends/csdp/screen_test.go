package csdp

import (
	"math"
	"slices"
	"strings"
	"testing"

	"towpath/backends"
	"towpath/model"
	"towpath/model/check"
)

// csdp takes numbers near the largest in C for infinity and answers with a nonsense certificate: such numbers end before the program starts.
func TestNumbersBeyondRangeNeverReachTheFile(t *testing.T) {
	equality := func(c, a, b float64) *model.Model {
		return &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{1, c}),
			Constraints: []model.Constraint{in(model.Real, model.Zero, []float64{b}, []term{{0, 1}, {1, a}, {2, 1}})}}
	}
	inequality := func(c, a, b float64) *model.Model {
		return &model.Model{Blocks: []model.Block{free(2)}, Objective: cost(0, term{1, c}),
			Constraints: []model.Constraint{in(model.Symmetric, model.PSD, []float64{1, b, 1}, []term{{0, 1}}, []term{{1, a}}, []term{{1, 1}})}}
	}
	d := &Driver{path: "/nonexistent/csdp"}
	for _, v := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), math.MaxFloat64, -math.MaxFloat64, 3e101} {
		for _, place := range [][3]float64{{v, 1, 1}, {1, v, 1}, {1, 1, v}} {
			for sheet, m := range map[string]*model.Model{
				EqualitySheet: equality(place[0], place[1], place[2]), InequalitySheet: inequality(place[0], place[1], place[2]),
			} {
				a, err := d.Solve(t.Context(), sheet, m, backends.Options{})
				if err == nil || !strings.Contains(err.Error(), "csdp is not given numbers beyond 1e+100") {
					t.Errorf("%s with cost, coefficient, constant %v: %v, %v", sheet, place, a, err)
				}
			}
		}
	}
	for name, bad := range map[string]float64{"NaN": math.NaN(), "Inf": math.Inf(1)} {
		m := equality(1, 1, 1)
		m.Constraints = append(m.Constraints, in(model.Real, model.Zero, []float64{bad}, nil))
		if p, err := fromEquality(m); err == nil {
			t.Errorf("%s as the constant of an empty row: settled as %v", name, p.settled)
		}
		m = inequality(bad, 0, 1)
		m.Constraints[0].Map.Lin.Re[2] = 0
		if p, err := fromInequality(m); err == nil {
			t.Errorf("%s as the cost of a column in no constraint: settled as %v", name, p.settled)
		}
	}
	for _, m := range []*model.Model{equality(2e100, -2e100, 1e100), equality(-2e100, 5e-324, -1e100)} {
		p, err := fromEquality(valid(t, m))
		if err != nil {
			t.Fatal(err)
		}
		readSDPAFile(t, string(p.text()))
	}
}

// csdp refuses rows without entries, and to it stored zeros are none: such rows are left out or answered at sight.
func TestEmptyRows(t *testing.T) {
	whole := in(model.Real, model.Zero, []float64{-1}, []term{{0, 1}, {2, 1}})
	row := func(b float64, terms ...term) model.Constraint {
		return in(model.Real, model.Zero, []float64{b}, terms)
	}
	equality := func(more ...model.Constraint) *model.Model {
		return &model.Model{Blocks: []model.Block{psd(2)}, Objective: cost(0, term{0, 1}), Constraints: more}
	}
	inequality := func(c1, a1 float64) *model.Model {
		return &model.Model{Blocks: []model.Block{free(2)}, Objective: cost(0, term{0, 1}, term{1, c1}),
			Constraints: []model.Constraint{in(model.Real, model.Nonneg, nil, []term{{0, 1}, {1, a1}})}}
	}
	never := &model.Model{Blocks: []model.Block{free(1)}, Constraints: []model.Constraint{in(model.Real, model.Nonneg, []float64{1}, nil)}}
	const noRow = "csdp needs at least one row that is not empty; use another sheet"
	for _, c := range []struct {
		name    string
		from    func(*model.Model) (*problem, error)
		m       *model.Model
		where   []int
		settled model.Outcome
		err     string
	}{
		{name: "0 = 0 between others", from: fromEquality, m: equality(whole, row(0), whole), where: []int{0, -1, 1}},
		{name: "stored zeros = 0", from: fromEquality, m: equality(row(0, term{0, 0}, term{1, 0}), whole), where: []int{-1, 0}},
		{name: "0 = rounding", from: fromEquality, m: equality(row(1e-16), whole), where: []int{-1, 0}},
		{name: "0 = 3", from: fromEquality, m: equality(whole, row(-3)), settled: model.Infeasible},
		{name: "0 = -3", from: fromEquality, m: equality(row(3), whole), settled: model.Infeasible},
		{name: "stored zeros = 1e300", from: fromEquality, m: equality(whole, row(-1e300, term{1, 0})), settled: model.Infeasible},
		{name: "empty rows only", from: fromEquality, m: equality(row(0), row(0, term{0, 0})), err: noRow},
		{name: "a column in a stored zero only", from: fromInequality, m: inequality(0, 0), where: []int{0, -1}},
		{name: "rounding as the cost of a column in no constraint", from: fromInequality, m: inequality(1e-16, 0), where: []int{0, -1}},
		{name: "a column in no constraint with a cost", from: fromInequality, m: inequality(-5, 0), settled: model.Unbounded},
		{name: "a column in no constraint with a large cost", from: fromInequality, m: inequality(1e300, 0), settled: model.Unbounded},
		{name: "no column in any constraint", from: fromInequality, m: never, err: noRow},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, err := c.from(valid(t, c.m))
			switch {
			case c.err != "":
				if err == nil || err.Error() != c.err {
					t.Errorf("error %v, want %s", err, c.err)
				}
			case err != nil:
				t.Error(err)
			case c.settled != model.OutcomeUnknown:
				if p.settled == nil || p.settled.Outcome != c.settled {
					t.Fatalf("settled as %v, want %s", p.settled, c.settled)
				}
				if r := check.Examine(c.m, p.settled, check.Tolerances{}); r.Verdict != check.Checked {
					t.Error(r)
				}
			default:
				if p.settled != nil || !slices.Equal(p.where, c.where) {
					t.Errorf("rows went to %v, want %v; settled %v", p.where, c.where, p.settled)
				}
				readSDPAFile(t, string(p.text()))
			}
		})
	}
}
