package exchange

import (
	"errors"
	"io"
	"math"
	"slices"
	"strings"
	"testing"

	"towpath/model"
)

// pairSDPA has every punctuation that the format allows: minimize x1 + 2 x2 subject to
// [[x1, -3], [-3, x2 + x1]] positive semidefinite, x1 - 1 >= 0, 4 - x2 >= 0.
const pairSDPA = `"moorings of the ferry
*a second remark
 2 =mDIM
 2  nBLOCK
 (2, -2) = sizes
{1.0, +2.0}
0 1 1 2 3.0
1 1 1 1 1.0D0
2 1 2 2 1
1 1 2 2 1e0
1 2 1 1 1.0
0 2 1 1 1.0
2 2 2 2 -1
0 2 2 2 -4
`

func TestSDPAIsReadAsWritten(t *testing.T) {
	m, err := ReadSDPA(strings.NewReader(pairSDPA))
	if err != nil {
		t.Fatal(err)
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	x := &model.Point{Values: [][]complex128{{5, 7}}}
	if got := m.ObjectiveAt(x); got != 19 {
		t.Errorf("objective at (5, 7): %g, want 5 + 2 * 7", got)
	}
	if got, want := m.RowsAt(0, x), []complex128{5, -3, 12}; !slices.Equal(got, want) {
		t.Errorf("block 1 at (5, 7), lower triangle by columns: %v, want %v", got, want)
	}
	if got, want := m.RowsAt(1, x), []complex128{4, -3}; !slices.Equal(got, want) {
		t.Errorf("block 2 at (5, 7): %v, want %v", got, want)
	}
	if c := &m.Constraints[0]; c.Name != "block 1" || c.Cone.Kind != model.PSD || c.Map.Field != model.Symmetric {
		t.Errorf("block 1 is %q, %s, %s", c.Name, c.Map.Field, c.Cone.Kind)
	}
	if c := &m.Constraints[1]; c.Cone.Kind != model.Nonneg || c.Map.Field != model.Real {
		t.Errorf("block 2 is %s, %s", c.Map.Field, c.Cone.Kind)
	}
}

func TestSDPALowerTriangleStandsForItsMirrorImage(t *testing.T) {
	m, err := ReadSDPA(strings.NewReader("1\n1\n3\n1\n1 1 3 1 2.5\n"))
	if err != nil {
		t.Fatal(err)
	}
	got := m.RowsAt(0, &model.Point{Values: [][]complex128{{1}}})
	if want := []complex128{0, 0, 2.5, 0, 0, 0}; !slices.Equal(got, want) {
		t.Errorf("%v, want %v", got, want)
	}
}

func TestBrokenSDPA(t *testing.T) {
	const head = "2\n2\n2 -2\n1 1\n"
	for _, c := range []struct{ text, want string }{
		{"", "the file: it ends before the number of variables; see whether it was cut off"},
		{"\"only a remark\n", "the file: it ends before the number of variables; see whether it was cut off"},
		{"2\n", "the file: it ends before the number of blocks; see whether it was cut off"},
		{"two\n", `line 1: "two" is not a number; write finite decimal numbers`},
		{"0\n1\n", "line 1: the number of variables is 0; it lies between 1 and 33554432"},
		{"-3\n1\n", "line 1: the number of variables is -3; it lies between 1 and 33554432"},
		{"1.5\n", "line 1: 1.5 is not a whole number of 32 bits; write a whole number"},
		{"99999999999\n", "line 1: 99999999999 is not a whole number of 32 bits; write a whole number"},
		{"40000000\n", "line 1: the number of variables is 40000000; it lies between 1 and 33554432"},
		{"2\n2\n2\n", "the file: it ends after 1 of 2 block sizes; see whether it was cut off"},
		{"2\n2\n2 0\n", "line 3: block 2 has size 0; leave it out"},
		{"2\n2\n2 100000\n", "line 3: block 2 has order 100000, the largest is 92681; split the block"},
		{"2\n2\n9000 2\n", "line 3: the blocks have more than 33554432 entries in their lower triangles; split the model"},
		{"2\n1\n2 3\n1 1\n", "line 3: more than 1 block sizes; correct the number of them, or take the rest away"},
		{"2\n1\n2\n1 1 1\n", "line 4: more than 2 objective coefficients; correct the number of them, or take the rest away"},
		{"2\n1\n2\n1\n", "the file: it ends after 1 of 2 objective coefficients; see whether it was cut off"},
		{"2\n1\n2\n1 nan\n", `line 4: "nan" is not a number; write finite decimal numbers`},
		{"2\n1\n2\n1 1e999\n", "line 4: 1e999 is too large for a 64-bit number; rescale the model"},
		{head + "1 1 1 1\n", "line 5: an entry of 4 words; write matrix, block, row, column and value"},
		{head + "3 1 1 1 1\n", "line 5: matrix 3 does not exist; the file has matrices 0 to 2"},
		{head + "-1 1 1 1 1\n", "line 5: matrix -1 does not exist; the file has matrices 0 to 2"},
		{head + "1 3 1 1 1\n", "line 5: block 3 does not exist; the file has blocks 1 to 2"},
		{head + "1 1 1 3 1\n", "line 5: row 1, column 3 lies outside block 1; rows and columns run from 1 to 2"},
		{head + "1 2 0 1 1\n", "line 5: row 0, column 1 lies outside block 2; rows and columns run from 1 to 2"},
		{head + "1 2 1 2 1\n", "line 5: row 1, column 2 is off the diagonal of block 2, which is diagonal; give the block a positive size"},
		{head + "1 1 1 1 inf\n", `line 5: "inf" is not a number; write finite decimal numbers`},
		{head + "1 1 1 2 1\n\n1 1 2 1 1\n", "line 7: this entry, or its mirror image, was given in line 5; give each pair of mirrored entries once"},
	} {
		m, err := ReadSDPA(strings.NewReader(c.text))
		if err == nil {
			t.Errorf("%q: read as %v, want %s", c.text, m, c.want)
			continue
		}
		if err.Error() != c.want {
			t.Errorf("%q:\n got %s\nwant %s", c.text, err, c.want)
		}
	}
}

func TestReadersPassOnTheErrorOfTheirSource(t *testing.T) {
	broken := errors.New("the cable is cut")
	for name, read := range map[string]func(io.Reader) (*model.Model, error){"sdpa": ReadSDPA, "mps": ReadMPS} {
		_, err := read(io.MultiReader(strings.NewReader("\n\n"), failing{broken}))
		if !errors.Is(err, broken) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

type failing struct{ err error }

func (f failing) Read([]byte) (int, error) { return 0, f.err }

// FuzzSDPA: whatever the bytes, the reader ends without a panic, and what it reads has finite numbers only.
func FuzzSDPA(f *testing.F) {
	f.Add([]byte(pairSDPA))
	f.Add([]byte("1\n1\n-1\n1\n1 1 1 1 1\n"))
	f.Add([]byte("1 = m\n1\n(1)\n{1}\n0 1 1 1 1e308\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		m, err := readSDPA(strings.NewReader(string(text)), 1<<12)
		if err != nil {
			if m != nil {
				t.Error("a model beside an error")
			}
			return
		}
		if err := m.Validate(); err != nil {
			t.Errorf("what was read is not a valid model: %v", err)
		}
		for k := range m.Constraints {
			for _, z := range m.RowsAt(k, &model.Point{Values: [][]complex128{make([]complex128, m.Blocks[0].Rows)}}) {
				if math.IsNaN(real(z)) || math.IsInf(real(z), 0) {
					t.Errorf("constraint %d at 0 is %v", k, z)
				}
			}
		}
	})
}
