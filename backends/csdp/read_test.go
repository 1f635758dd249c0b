package csdp

import (
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"towpath/backends/child"
	"towpath/model"
)

// reader is a problem with a matrix block of order 2, a diagonal of length 2 and two rows:
// min x00 + 3 x10 + 5 v0 + 2 with x00 + x11 = 1, 4 x10 + v1 = 7.
func reader(t testing.TB) *problem {
	t.Helper()
	p, err := fromEquality(valid(t, &model.Model{
		Blocks:    []model.Block{psd(2), nonneg(2)},
		Objective: cost(2, term{0, 1}, term{1, 3}, term{3, 5}),
		Constraints: []model.Constraint{
			in(model.Real, model.Zero, []float64{-1}, []term{{0, 1}, {2, 1}}),
			in(model.Real, model.Zero, []float64{-7}, []term{{1, 4}, {4, 1}}),
		},
	}))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// column is the same on the other sheet, with the blocks as constraints: min 3 u0 - u1.
func column(t testing.TB) *problem {
	t.Helper()
	p, err := fromInequality(valid(t, &model.Model{
		Blocks:    []model.Block{free(2)},
		Objective: cost(2, term{0, 3}, term{1, -1}),
		Constraints: []model.Constraint{
			in(model.Symmetric, model.PSD, []float64{1, 0, -4}, []term{{0, 1}}, []term{{1, 2}}, []term{{0, 1}}),
			in(model.Real, model.Nonneg, []float64{0.5, 0}, []term{{1, 1}}, []term{{0, 1}}),
		},
	}))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

const (
	slack = "1 1 1 1 1\n1 1 2 2 1\n1 2 1 1 1\n1 2 2 2 1\n"
	good  = "1.5e+00 -2 \n" + slack + "2 1 1 1 0.25\n2 1 1 2 -1.25e-1\n2 1 2 2 0.75\n2 2 1 1 8\n2 2 2 2 7.5\n"
)

func files(out string) map[string][]byte { return map[string][]byte{"out": []byte(out)} }

// What the good file says, by hand: X = [0.25 -0.125; -0.125 0.75], v = (8, 7.5), y = (1.5, -2).
func TestReadGivesEveryNumberItsPlace(t *testing.T) {
	output := "CSDP 6.2.0\nIter:  0 Ap: 0.00e+00 Pobj:  1.0e+00 Ad: 0.00e+00 Dobj:  1.0e+00 \nIter: 13 Ap: 1.00e+00 Pobj:  1.0e+00 Ad: 1.00e+00 Dobj:  1.0e+00 \nSuccess: SDP solved\n"
	x := []complex128{0.25, -0.125, 0.75, 8, 7.5}
	for _, c := range []struct {
		name             string
		p                *problem
		code             int
		want             model.Outcome
		objective, bound float64 // when the outcome has a point
		point, y         []complex128
	}{
		// 0.25 - 0.375 + 40 + 2; -(1 * 1.5 + 7 * -2) + 2
		{"equality, solved", reader(t), 0, model.Optimal, 41.875, 14.5, x, []complex128{-1.5, 2}},
		{"equality, partly", reader(t), 3, model.Inaccurate, 41.875, 14.5, x, []complex128{-1.5, 2}},
		{"equality, out of iterations", reader(t), 4, model.Inaccurate, 41.875, 14.5, x, []complex128{-1.5, 2}},
		{"equality, stuck", reader(t), 7, model.Inaccurate, 41.875, 14.5, x, []complex128{-1.5, 2}},
		{"equality, no X", reader(t), 1, model.Infeasible, math.NaN(), math.NaN(), nil, []complex128{-1.5, 2}},
		{"equality, no y", reader(t), 2, model.Unbounded, math.NaN(), math.NaN(), x, nil},
		// 3 * 1.5 + 2 + 2; minus the constants times X: -0.25 + 4 * 0.75 - 0.5 * 8 + 2
		{"inequality, solved", column(t), 0, model.Optimal, 8.5, 0.75, []complex128{1.5, -2}, x},
		{"inequality, stuck", column(t), 5, model.Inaccurate, 8.5, 0.75, []complex128{1.5, -2}, x},
		{"inequality, no X", column(t), 1, model.Unbounded, math.NaN(), math.NaN(), []complex128{1.5, -2}, nil},
		{"inequality, no y", column(t), 2, model.Infeasible, math.NaN(), math.NaN(), nil, x},
	} {
		t.Run(c.name, func(t *testing.T) {
			a, err := c.p.read(&child.Result{Code: c.code, Output: output, Files: files(good)})
			if err != nil {
				t.Fatal(err)
			}
			if a.Outcome != c.want || a.Iterations != 13 || a.Note != "csdp: Success: SDP solved" {
				t.Errorf("%s after %d iterations, %q", a.Outcome, a.Iterations, a.Note)
			}
			if !equal(a.Objective, c.objective) || !equal(a.Bound, c.bound) {
				t.Errorf("objective %g, bound %g, want %g and %g", a.Objective, a.Bound, c.objective, c.bound)
			}
			certificate := c.want == model.Infeasible || c.want == model.Unbounded
			if (a.Point != nil) == certificate || (a.Multipliers != nil) == certificate {
				t.Errorf("%s with point %v and multipliers %v", a.Outcome, a.Point, a.Multipliers)
			}
			point, y := a.Point, a.Multipliers
			if certificate {
				point, y = a.Ray, a.Farkas
			}
			if got := joined(point, nil); !alike(got, c.point) {
				t.Errorf("entries %v, want %v", got, c.point)
			}
			if got := joined(nil, y); !alike(got, c.y) {
				t.Errorf("multipliers %v, want %v", got, c.y)
			}
		})
	}
}

func equal(a, b float64) bool { return a == b || math.IsNaN(a) && math.IsNaN(b) }

// joined lists the numbers of a point or of multipliers.
func joined(x *model.Point, y *model.Multipliers) (out []complex128) {
	var lists [][]complex128
	if x != nil {
		lists = x.Values
	}
	if y != nil {
		lists = y.Constraints
	}
	for _, l := range lists {
		out = append(out, l...)
	}
	return out
}

func alike(a, b []complex128) bool {
	for i := range a {
		if len(a) != len(b) || a[i] != b[i] {
			return false
		}
	}
	return len(a) == len(b)
}

// Every file that is not what csdp promises gives an error that says what is wrong with it, in few words.
func TestReadRefuses(t *testing.T) {
	const x = "2 1 1 1 1\n2 1 2 2 1\n2 2 1 1 1\n2 2 2 2 1\n"
	long := strings.Repeat("x", 1<<24)
	for _, c := range []struct{ name, file, want string }{
		{"empty", "", "it is empty"},
		{"only an end of line", "\n", "it has 0 multipliers for 2 rows"},
		{"too few multipliers", "1\n" + x, "it has 1 multipliers for 2 rows"},
		{"too many multipliers", "1 2 3\n" + x, "more than 2 multipliers for 2 rows"},
		{"cut within the multipliers", "1 2", "it ends within a line"},
		{"cut after the multipliers", "1 2\n", "it is cut short: the last entry of X is missing"},
		{"cut between the matrices", "1 2\n" + slack, "it is cut short: the last entry of X is missing"},
		{"cut before the last line", strings.TrimSuffix(good, "2 2 2 2 7.5\n"), "it is cut short: the last entry of X is missing"},
		{"cut within the last number", strings.TrimSuffix(good, ".5\n"), "it ends within a line"},
		{"cut and mended", strings.TrimSuffix(good, " 7.5\n") + "\n", `line "2 2 2 2" does not have 5 fields`},
		{"words for multipliers", "Segmentation fault\n" + x, `"Segmentation" is not a number in range`},
		{"words for an entry", "1 2\nout of paper, says disk\n", `line "out of paper, says disk" does not begin with four whole numbers`},
		{"bytes", "\x00\xff\xfe\x01\n", `"\x00\xff\xfe\x01" is not a number in range`},
		{"nan among multipliers", "1 nan\n" + x, `"nan" is not finite`},
		{"-nan among multipliers", "1 -nan\n" + x, `"-nan" is not a number in range`},
		{"inf among multipliers", "inf 1\n" + x, `"inf" is not finite`},
		{"-inf in X", "1 2\n2 1 1 1 -inf\n", `has a value that cannot be: "-inf" is not finite`},
		{"nan in Z", "1 2\n1 1 1 1 nan\n" + x, `has a value that cannot be: "nan" is not finite`},
		{"a value out of range", "1 2\n2 1 1 1 1e999\n", `"1e999" is not a number in range`},
		{"matrix 0", "1 2\n0 1 1 1 1\n" + x, `line "0 1 1 1 1" names no entry`},
		{"matrix 3", "1 2\n3 1 1 1 1\n" + x, `line "3 1 1 1 1" names no entry`},
		{"block 0", "1 2\n2 0 1 1 1\n" + x, `line "2 0 1 1 1" names no entry`},
		{"block 3", "1 2\n2 3 1 1 1\n" + x, `line "2 3 1 1 1" names no entry`},
		{"block -1", "1 2\n2 -1 1 1 1\n" + x, `line "2 -1 1 1 1" names no entry`},
		{"row 0", "1 2\n2 1 0 1 1\n" + x, `line "2 1 0 1 1" names no entry`},
		{"column 3 of 2", "1 2\n2 1 1 3 1\n" + x, `line "2 1 1 3 1" names no entry`},
		{"row 3 of 2", "1 2\n2 1 3 1 1\n" + x, `line "2 1 3 1 1" names no entry`},
		{"row 2 billions", "1 2\n2 1 2000000000 1 1\n" + x, `names no entry`},
		{"more than an integer", "1 2\n2 1 1 99999999999999999999 1\n" + x, `does not begin with four whole numbers`},
		{"a fraction for an index", "1 2\n2 1 1.0 1 1\n" + x, `does not begin with four whole numbers`},
		{"off a diagonal", "1 2\n2 2 1 2 1\n" + x, `line "2 2 1 2 1" names no entry`},
		{"six fields", "1 2\n2 1 1 1 1 1\n" + x, `line "2 1 1 1 1 1" does not have 5 fields`},
		{"a long word", long + "\n", "is not a number in range"},
		{"a long word in an entry", "1 2\n2 1 1 1 " + long + "\n", "is not a number in range"},
		{"a long word for an index", "1 2\n2 " + long + " 1 1 1\n", "does not begin with four whole numbers"},
		{"a long line of numbers", strings.Repeat("1 ", 1<<22) + "\n", "more than 2 multipliers for 2 rows"},
		{"a long line of fields", "1 2\n" + strings.Repeat("1 ", 1<<22) + "\n", "does not have 5 fields"},
	} {
		t.Run(c.name, func(t *testing.T) {
			for name, p := range map[string]*problem{"equality": reader(t), "inequality": column(t)} {
				a, err := p.read(&child.Result{Code: solved, Files: files(c.file)})
				if err == nil {
					t.Fatalf("%s: read as %+v", name, a)
				}
				if text := err.Error(); !strings.HasPrefix(text, "csdp's solution file: ") || !strings.Contains(text, c.want) || len(text) > 700 {
					t.Errorf("%s: error %.700q, want %q", name, text, c.want)
				}
			}
		})
	}
}

// A file of 20 megabytes that says the same again and again is read for what it says.
func TestReadTakesManyLines(t *testing.T) {
	a, err := reader(t).read(&child.Result{Code: solved, Files: files("1.5 -2\n" + strings.Repeat(slack, 1<<19) + strings.TrimPrefix(good, "1.5e+00 -2 \n"))})
	if err != nil {
		t.Fatal(err)
	}
	if a.Objective != 41.875 {
		t.Errorf("objective %g, want 41.875", a.Objective)
	}
}

// Without a solution file, or with an end that leaves none, the error tells the code and the last words of the program.
func TestReadWithoutSolution(t *testing.T) {
	for _, c := range []struct {
		name string
		r    child.Result
		want string
	}{
		{"no file", child.Result{Code: 0, Output: "Success: SDP solved\n"}, "csdp ended with code 0 and no solution: Success: SDP solved"},
		{"a signal", child.Result{Code: -1, Files: files(good)}, "csdp ended with code -1 and no solution: "},
		{"a crash told by a shell", child.Result{Code: 139, Output: "Segmentation fault\n", Files: files(good)}, "csdp ended with code 139 and no solution: Segmentation fault"},
		{"out of memory", child.Result{Code: 10, Output: "Storage Allocation Failed!\n", Files: files(good)}, "csdp ended with code 10 and no solution: Storage Allocation Failed!"},
		{"input refused", child.Result{Code: 206, Output: "Constraint 1 is empty\n"}, "csdp ended with code 206 and no solution: Constraint 1 is empty"},
		{"solution not written", child.Result{Code: 204}, "csdp ended with code 204 and no solution: "},
	} {
		t.Run(c.name, func(t *testing.T) {
			a, err := reader(t).read(&c.r)
			if err == nil || err.Error() != c.want {
				t.Errorf("%v, error %v, want %s", a, err, c.want)
			}
		})
	}
	_, err := reader(t).read(&child.Result{Code: 139, Output: strings.Repeat("\xff\xf0ä", 1<<18)})
	if text := err.Error(); !utf8.ValidString(text) || len(text) > 700 {
		t.Errorf("an output of bytes is told in %d bytes, as text: %t", len(text), utf8.ValidString(text))
	}
}

// FuzzSolution: whatever the file, read ends with a short error or with finite numbers in the model's shape.
func FuzzSolution(f *testing.F) {
	for _, s := range []string{good, "", "\n", "1 2", "1 2\n", "1 nan\n", "1 2\n2 1 1 1 inf\n", "1 2\n2 9 9 9 9\n", "1 2\n2 2 2 2 1\n", "1 2\n2 -1 0 99999999999999999999 1e999\n",
		strings.ReplaceAll(good, "\n", "\r\n"), strings.ReplaceAll(good, " ", "\t"), "0x1p-2 1_0\n2 2 2 2 0x1\n", "\x00\xff\n", slack} {
		for code := range lastStuck + 1 {
			f.Add([]byte(s), code)
		}
	}
	equality, inequality := reader(f), column(f)
	f.Fuzz(func(t *testing.T, file []byte, code int) {
		for _, p := range []*problem{equality, inequality} {
			a, err := p.read(&child.Result{Code: code, Output: string(file), Files: map[string][]byte{"out": file}})
			if err != nil {
				if n := len(err.Error()); n > 1000 {
					t.Errorf("an error of %d bytes", n)
				}
				continue
			}
			if a.Outcome == model.OutcomeUnknown || a.Outcome == model.Optimal && code != solved || !utf8.ValidString(a.Note) {
				t.Errorf("code %d is read as %s, %q", code, a.Outcome, a.Note)
			}
			seen := 0
			for _, x := range []*model.Point{a.Point, a.Ray} {
				if x != nil {
					shaped(t, joined(x, nil), len(joined(p.noPoint(), nil)))
					seen++
				}
			}
			for _, y := range []*model.Multipliers{a.Multipliers, a.Farkas} {
				if y != nil {
					shaped(t, joined(nil, y), len(joined(nil, p.noMultipliers())))
					seen++
				}
			}
			if seen == 0 {
				t.Errorf("code %d gives %s and nothing with it", code, a.Outcome)
			}
		}
	})
}

// shaped holds numbers to their count and to being finite and real.
func shaped(t *testing.T, v []complex128, n int) {
	t.Helper()
	if len(v) != n {
		t.Errorf("%d numbers, want %d", len(v), n)
	}
	for _, x := range v {
		if math.IsNaN(real(x)-real(x)) || imag(x) != 0 {
			t.Errorf("a number is %v", x)
		}
	}
}
