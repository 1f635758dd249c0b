package exchange

import (
	"math"
	"strings"
	"testing"

	"towpath/model"
)

// ferryMPS uses every kind of row and bound once, in free form; the set of right-hand sides has a name, the others have
// none.
const ferryMPS = `* what the ferry carries
NAME          ferry
OBJSENSE
    MAX
ROWS
 N  income
 N  forgotten
 E  crew
 L  deck
 G  mail
 E  eastward
 E  westward
 G  within
 L  below
COLUMNS
 goods  income 3 crew 1
 goods  deck 2.5D0
 mail_bags income -1 mail 1
 mail_bags forgotten 7 eastward 1
 people income 2 westward 1
 people within 1 below 1
 spare crew 1e0
 debt crew -1
 fixed deck 1
RHS
 need income -10 crew 4
 need deck 20 mail 2
 need eastward 5 westward 5
 need within 1
 need below 9
RANGES
 eastward 2 westward -3
 within 4 below 6
BOUNDS
 UP goods 8
 LO mail_bags 1
 MI spare
 UP spare -1
 FR debt
 FX fixed 3
 PL people
ENDATA
what comes after is not read
`

func TestMPSIsReadAsWritten(t *testing.T) {
	m, err := ReadMPS(strings.NewReader(ferryMPS))
	if err != nil {
		t.Fatal(err)
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	if m.Name != "ferry" || m.Objective.Sense != model.Maximize {
		t.Errorf("name %q, sense %s", m.Name, m.Objective.Sense)
	}
	// goods, mail_bags, people, spare, debt, fixed
	x := &model.Point{Values: [][]complex128{{2}, {3}, {5}, {7}, {11}, {13}}}
	if got, want := m.ObjectiveAt(x), 3.0*2-3+2*5+10; got != want {
		t.Errorf("income %g, want %g", got, want)
	}
	for k, want := range []struct {
		name         string
		kind         model.ConeKind
		row          float64
		lower, upper float64 // of range rows
	}{
		{"crew", model.Zero, 2 + 7 - 11 - 4, 0, 0},
		{"deck", model.Nonneg, 20 - 2.5*2 - 13, 0, 0},
		{"mail", model.Nonneg, 3 - 2, 0, 0},
		{"eastward", model.Range, 3, 5, 7},
		{"westward", model.Range, 5, 2, 5},
		{"within", model.Range, 5, 1, 5},
		{"below", model.Range, 5, 3, 9},
	} {
		c := &m.Constraints[k]
		if c.Name != want.name || c.Cone.Kind != want.kind {
			t.Errorf("constraint %d is %q %s, want %q %s", k, c.Name, c.Cone.Kind, want.name, want.kind)
			continue
		}
		if got := m.RowsAt(k, x); got[0] != complex(want.row, 0) {
			t.Errorf("%s: row %v, want %g", c.Name, got, want.row)
		}
		if want.kind == model.Range && (real(c.Cone.Lower[0]) != want.lower || real(c.Cone.Upper[0]) != want.upper) {
			t.Errorf("%s: [%v, %v], want [%g, %g]", c.Name, c.Cone.Lower, c.Cone.Upper, want.lower, want.upper)
		}
	}
	inf := math.Inf(1)
	for b, want := range []struct {
		name         string
		lower, upper float64 // of block cone and bounds together
	}{{"goods", 0, 8}, {"mail_bags", 1, inf}, {"people", 0, inf}, {"spare", -inf, -1}, {"debt", -inf, inf}, {"fixed", 3, 3}} {
		blk := &m.Blocks[b]
		lower, upper := -inf, inf
		if blk.Bounds != nil {
			lower, upper = real(blk.Bounds.Lower[0]), real(blk.Bounds.Upper[0])
		}
		if blk.Cone == model.Nonneg {
			lower = max(lower, 0)
		}
		if blk.Name != want.name || lower != want.lower || upper != want.upper {
			t.Errorf("column %d is %q in [%g, %g], want %q in [%g, %g]", b, blk.Name, lower, upper, want.name, want.lower, want.upper)
		}
	}
}

// Fixed columns and free form are one and the same as long as names have no blanks.
func TestMPSInFixedColumns(t *testing.T) {
	const fixed = `NAME          BOATS
ROWS
 N  COST
 G  FUEL
COLUMNS
    X         COST               3.0   FUEL               1.0
    Y         COST               2.0   FUEL               1.0
RHS
    RHS       FUEL               4.0
BOUNDS
 UP BND       X                  3.0
 MI BND       Y
ENDATA
`
	m, err := ReadMPS(strings.NewReader(fixed))
	if err != nil {
		t.Fatal(err)
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	x := &model.Point{Values: [][]complex128{{1}, {10}}}
	if got := m.RowsAt(0, x)[0]; got != 7 || m.ObjectiveAt(x) != 23 || m.Blocks[1].Cone != model.Free {
		t.Errorf("row %v, objective %g, cone of Y %s", got, m.ObjectiveAt(x), m.Blocks[1].Cone)
	}
}

func TestBrokenMPS(t *testing.T) {
	const head = "NAME t\nROWS\n N c\n L r\n E e\nCOLUMNS\n x c 1 r 1\n y c 1\n"
	for _, c := range []struct{ text, want string }{
		{"", "the file: it ends without ENDATA; see whether it was cut off"},
		{head, "the file: it ends without ENDATA; see whether it was cut off"},
		{" x c 1\n", "line 1: data outside a section; begin with NAME or ROWS"},
		{"NAME t\n x c 1\n", "line 2: data outside a section; begin with NAME or ROWS"},
		{"SOS\n", "line 1: section SOS is unknown; linear programs have NAME, OBJSENSE, ROWS, COLUMNS, RHS, RANGES, BOUNDS and ENDATA; indent data lines"},
		{"OBJSENSE\n up\n", "line 2: sense up is unknown; write MAX or MIN"},
		{"ROWS\n E r\nENDATA\n", "the file: it has no N row; declare the objective in ROWS"},
		{"ROWS\n Q r\n", "line 2: row kind Q is unknown; use N, E, L or G"},
		{"ROWS\n L the row\n", "line 2: a row of 3 words; write its kind and its name, which has no blanks"},
		{"ROWS\n L r\n L r\n", "line 3: row r is declared twice; give every row its own name"},
		{head + " M1 'MARKER' 'INTORG'\n", "line 9: integer columns begin here; no back end takes integer columns; take the MARKER lines away to solve the relaxation"},
		{head + " z c\n", "line 9: a column line of 2 words; write the column and one or two pairs of row and value; names have no blanks"},
		{head + " z s 1\n", "line 9: row s does not exist; declare it in ROWS or correct its name"},
		{head + " z c one\n", `line 9: "one" is not a number; write finite decimal numbers`},
		{head + " z c nan\n", `line 9: "nan" is not a number; write finite decimal numbers`},
		{head + " z c 0x10\n", `line 9: "0x10" is not a number; write finite decimal numbers`},
		{head + " z c 1e400\n", "line 9: 1e400 is too large for a 64-bit number; rescale the model"},
		{head + " y c 2\n", "line 9: the entry of column y in row c was given in line 8; give each entry once"},
		{head + " x e 2\n", "line 9: column x goes on after other columns; write all entries of a column together"},
		{head + "RHS\n b r 1 e\n", "line 10: row b does not exist; declare it in ROWS or correct its name"},
		{head + "RHS\n r\n", "line 10: a line of 0 words; write the set's name and one or two pairs of row and value"},
		{head + "RHS\n b r 1\n c e 1\n", "line 11: a second set of right-hand sides, c; keep one set in the file"},
		{head + "RHS\n b r 1\n b r 1\n", "line 11: row r had its right-hand side in line 10; give each row one"},
		{head + "RANGES\n b c 1\n", "line 10: row c is free and cannot have a range; make it an E, L or G row"},
		{head + "RANGES\n b r 1 r 2\n", "line 10: row r had its range in line 10; give each row one"},
		{head + "BOUNDS\n BV b x\n", "line 10: bound BV makes a column integer or semicontinuous; no back end takes such columns; use LO and UP to solve the relaxation"},
		{head + "BOUNDS\n XX b x\n", "line 10: bound kind XX is unknown; use LO, UP, FX, FR, MI or PL"},
		{head + "BOUNDS\n UP b z 1\n", "line 10: column z does not exist; write the bound's kind, its set, the column and the value"},
		{head + "BOUNDS\n UP\n", "line 10: a bound of 1 words; write the bound's kind, its set, the column and the value"},
		{head + "BOUNDS\n UP b x 1\n UP b x 1\n", "line 11: this bound on column x was given in line 10; give each bound once"},
		{head + "BOUNDS\n LO b x 1\n FX b x 1\n", "line 11: this bound on column x was given in line 10; give each bound once"},
		{head + "BOUNDS\n UP b x 1\n UP c y 1\n", "line 11: a second set of bounds, c; keep one set in the file"},
		{head + "BOUNDS\n UP b x -1\nENDATA\n", "line 10: column x has the negative upper bound -1 and no lower one, which programs read in two ways; state the lower bound too, with LO or MI"},
	} {
		m, err := ReadMPS(strings.NewReader(c.text))
		if err == nil {
			t.Errorf("%q: read as %v, want %s", c.text, m, c.want)
			continue
		}
		if err.Error() != c.want {
			t.Errorf("%q:\n got %s\nwant %s", c.text, err, c.want)
		}
	}
}

// What only the model's own rules forbid is named by column and row: contrary bounds, names too long.
func TestMPSLeavesTheRestToValidation(t *testing.T) {
	const text = "ROWS\n N c\nCOLUMNS\n x c 1\nBOUNDS\n LO b x 3\n UP b x 2\nENDATA\n"
	m, err := ReadMPS(strings.NewReader(text))
	if err != nil {
		t.Fatal(err)
	}
	const want = "block 0 'x', entry 0: the lower limit 3 on the value is above the upper limit 2; exchange or correct them"
	if err := m.Validate(); err == nil || err.Error() != want {
		t.Errorf("%v, want %s", err, want)
	}
}

// FuzzMPS: whatever the bytes, the reader ends without a panic, and validation and evaluation hold on what it reads.
func FuzzMPS(f *testing.F) {
	f.Add([]byte(ferryMPS))
	f.Add([]byte("ROWS\n N c\n E r\nCOLUMNS\n x r 1\nRHS\n r 1\nRANGES\n r -1\nBOUNDS\n FR x\nENDATA\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		m, err := ReadMPS(strings.NewReader(string(text)))
		if err != nil {
			if m != nil {
				t.Error("a model beside an error")
			}
			return
		}
		if m.Validate() != nil {
			return
		}
		x := &model.Point{}
		for range m.Blocks {
			x.Values = append(x.Values, []complex128{0})
		}
		for k := range m.Constraints {
			for _, z := range m.RowsAt(k, x) {
				if math.IsNaN(real(z)) || math.IsInf(real(z), 0) {
					t.Errorf("constraint %d at 0 is %v", k, z)
				}
			}
		}
	})
}
