package model_test

import (
	"math"
	"strings"
	"testing"

	"towpath/model"
)

// long is a name of so many bytes.
func long(bytes int) string { return strings.Repeat("n", bytes) }

const (
	knownFields = "use real, complex, symmetric or hermitian"
	blockCones  = "real blocks may be free, nonneg, lorentz or rotated-lorentz, complex ones free, matrices free or psd; write other sets as constraints"
	ownLimits   = "give one of each per entry, infinite where there is none"
	noLimit     = "send numbers, infinite where there is no limit"
)

func TestNamesRefused(t *testing.T) {
	tryBroken(t, []broken{
		{"model name too long", func(m *model.Model) { m.Name = long(257) },
			"name", "the model", "its name has 257 bytes", "use at most 256"},
		{"model name not UTF-8", func(m *model.Model) { m.Name = "a\xff" },
			"name", "the model", "its name is not UTF-8", "send UTF-8"},
		{"model name with a line break", func(m *model.Model) { m.Name = "a\nb" },
			"name", "the model", "its name has the control character U+000A", "use printable characters"},
		{"block name too long", func(m *model.Model) { m.Blocks[1].Name = long(1 << 20) },
			"blocks[1].name", "block 1", "its name has 1048576 bytes", "use at most 256"},
		{"block name not UTF-8", func(m *model.Model) { m.Blocks[0].Name = "\xc3" },
			"blocks[0].name", "block 0", "its name is not UTF-8", "send UTF-8"},
		{"block name with an escape", func(m *model.Model) { m.Blocks[3].Name = "\x1b[2J" },
			"blocks[3].name", "block 3", "its name has the control character U+001B", "use printable characters"},
		{"block name with a C1 control", func(m *model.Model) { m.Blocks[3].Name = "a\u0085" },
			"blocks[3].name", "block 3", "its name has the control character U+0085", "use printable characters"},
		{"blocks of one name", func(m *model.Model) { m.Blocks[5].Name = "z" },
			"blocks[5].name", "block 5 'z'", "block 1 has the same name", "give every block its own name, or none"},
		{"constraint name too long", func(m *model.Model) { m.Constraints[2].Name = long(257) },
			"constraints[2].name", "constraint 2", "its name has 257 bytes", "use at most 256"},
		{"constraint name not UTF-8", func(m *model.Model) { m.Constraints[4].Name = "\xed\xa0\x80" },
			"constraints[4].name", "constraint 4", "its name is not UTF-8", "send UTF-8"},
		{"constraint name with a delete", func(m *model.Model) { m.Constraints[4].Name = "\x7f" },
			"constraints[4].name", "constraint 4", "its name has the control character U+007F", "use printable characters"},
		{"constraints of one name", func(m *model.Model) { m.Constraints[10].Name = "gram" },
			"constraints[10].name", "constraint 10 'gram'", "constraint 8 has the same name", "give every constraint its own name, or none"},
	})
}

func TestBlocksRefused(t *testing.T) {
	const most = math.MaxInt
	tryBroken(t, []broken{
		{"no blocks", func(m *model.Model) { m.Blocks = nil },
			"blocks", "the model", "it has no blocks", "give at least one block of decision variables"},
		{"unknown field", func(m *model.Model) { m.Blocks[0].Field = 4 },
			"blocks[0].field", "block 0 'x'", "field number 4 is unknown", knownFields},
		{"no rows", func(m *model.Model) { m.Blocks[4].Rows = 0 },
			"blocks[4].rows", "block 4", "its shape is 0 x 1", "give at least one row and one column"},
		{"no columns", func(m *model.Model) { m.Blocks[1].Cols = 0 },
			"blocks[1].cols", "block 1 'z'", "its shape is 2 x 0", "give at least one row and one column"},
		{"negative shape", func(m *model.Model) { m.Blocks[3].Rows, m.Blocks[3].Cols = math.MinInt, math.MinInt },
			"blocks[3].rows", "block 3 'H'", "its shape is -9223372036854775808 x -9223372036854775808", "give at least one row and one column"},
		{"symmetric and not square", func(m *model.Model) { m.Blocks[2].Cols = 1 },
			"blocks[2].cols", "block 2 'S'", "a symmetric matrix of shape 2 x 1 is not square", "give the order as rows and columns"},
		{"Hermitian and not square", func(m *model.Model) { m.Blocks[3].Rows = most },
			"blocks[3].cols", "block 3 'H'", "a hermitian matrix of shape 9223372036854775807 x 2 is not square", "give the order as rows and columns"},
		{"order too large by one", func(m *model.Model) { m.Blocks[2].Rows, m.Blocks[2].Cols = 92682, 92682 },
			"blocks[2].rows", "block 2 'S'", "order 92682 is larger than 92681", "split the block"},
		{"order whose square overflows", func(m *model.Model) { m.Blocks[3].Rows, m.Blocks[3].Cols = most, most },
			"blocks[3].rows", "block 3 'H'", "order 9223372036854775807 is larger than 92681", "split the block"},
		{"vector too long by one", func(m *model.Model) { m.Blocks[0].Rows = 1 << 32 },
			"blocks[0].rows", "block 0 'x'", "4294967296 x 1 entries are more than 4294967295", "split the block"},
		{"shape whose product overflows to zero", func(m *model.Model) { m.Blocks[1].Rows, m.Blocks[1].Cols = 1<<32, 1<<32 },
			"blocks[1].rows", "block 1 'z'", "4294967296 x 4294967296 entries are more than 4294967295", "split the block"},
		{"shape whose product overflows to one", func(m *model.Model) { m.Blocks[1].Rows, m.Blocks[1].Cols = most, most },
			"blocks[1].rows", "block 1 'z'", "9223372036854775807 x 9223372036854775807 entries are more than 4294967295", "split the block"},
		{"too many columns", func(m *model.Model) { m.Blocks[1].Rows, m.Blocks[1].Cols = 1, most },
			"blocks[1].rows", "block 1 'z'", "1 x 9223372036854775807 entries are more than 4294967295", "split the block"},
		{"blocks too large together by one", func(m *model.Model) {
			m.Blocks = append(m.Blocks, model.Block{Name: "last", Rows: model.MaxEntries - 17, Cols: 1})
		}, "blocks[6]", "block 6 'last'", "the blocks together have more than 4294967295 entries", "split the model"},
		{"unknown cone", func(m *model.Model) { m.Blocks[0].Cone = 8 },
			"blocks[0].cone", "block 0 'x'", "cone number 8 is unknown", "use free, nonneg, lorentz, rotated-lorentz or psd"},
		{"real and psd", func(m *model.Model) { m.Blocks[0].Cone = model.PSD },
			"blocks[0].cone", "block 0 'x'", "a real block cannot lie in the cone psd", blockCones},
		{"real and zero", func(m *model.Model) { m.Blocks[0].Cone = model.Zero },
			"blocks[0].cone", "block 0 'x'", "a real block cannot lie in the cone zero", blockCones},
		{"real and box", func(m *model.Model) { m.Blocks[0].Cone = model.Box },
			"blocks[0].cone", "block 0 'x'", "a real block cannot lie in the cone box", blockCones},
		{"complex and nonneg", func(m *model.Model) { m.Blocks[1].Cone = model.Nonneg },
			"blocks[1].cone", "block 1 'z'", "a complex block cannot lie in the cone nonneg", blockCones},
		{"symmetric and nonneg", func(m *model.Model) { m.Blocks[2].Cone = model.Nonneg },
			"blocks[2].cone", "block 2 'S'", "a symmetric block cannot lie in the cone nonneg", blockCones},
		{"Hermitian and lorentz", func(m *model.Model) { m.Blocks[3].Cone = model.Lorentz },
			"blocks[3].cone", "block 3 'H'", "a hermitian block cannot lie in the cone lorentz", blockCones},
		{"rotated cone of one entry", func(m *model.Model) {
			m.Blocks = append(m.Blocks, model.Block{Name: "thin", Rows: 1, Cols: 1, Cone: model.RotatedLorentz})
		}, "blocks[6].rows", "block 6 'thin'", "a rotated lorentz cone has at least 2 entries", "give u, v and the rest"},
	})
}

func TestBoundsRefused(t *testing.T) {
	lower := func(block, entry int, x complex128) func(m *model.Model) {
		return func(m *model.Model) { m.Blocks[block].Bounds.Lower[entry] = x }
	}
	upper := func(block, entry int, x complex128) func(m *model.Model) {
		return func(m *model.Model) { m.Blocks[block].Bounds.Upper[entry] = x }
	}
	tryBroken(t, []broken{
		{"no bounds in the bounds", func(m *model.Model) { m.Blocks[3].Bounds = &model.Bounds{} },
			"blocks[3].bounds", "block 3 'H'", "it has 0 lower and 0 upper bounds for 3 entries", ownLimits},
		{"a lower bound is missing", func(m *model.Model) { m.Blocks[0].Bounds.Lower = m.Blocks[0].Bounds.Lower[:2] },
			"blocks[0].bounds", "block 0 'x'", "it has 2 lower and 3 upper bounds for 3 entries", ownLimits},
		{"an upper bound too many", func(m *model.Model) { m.Blocks[1].Bounds.Upper = append(m.Blocks[1].Bounds.Upper, 0) },
			"blocks[1].bounds", "block 1 'z'", "it has 4 lower and 5 upper bounds for 4 entries", ownLimits},
		{"lower bound NaN", lower(0, 2, complex(nan, 0)),
			"blocks[0].bounds", "block 0 'x', entry 2", "a limit on the value is NaN", noLimit},
		{"upper bound NaN", upper(3, 2, complex(nan, 0)),
			"blocks[3].bounds", "block 3 'H', entry 2", "a limit on the value is NaN", noLimit},
		{"real part of a bound NaN", lower(1, 3, complex(nan, 0)),
			"blocks[1].bounds", "block 1 'z', entry 3", "a limit on the real part is NaN", noLimit},
		{"imaginary part of a bound NaN", upper(3, 1, complex(1, nan)),
			"blocks[3].bounds", "block 3 'H', entry 1", "a limit on the imaginary part is NaN", noLimit},
		{"lower bound +Inf", lower(0, 1, complex(inf, 0)),
			"blocks[0].bounds", "block 0 'x', entry 1", "the lower limit on the value is +Inf", "use -Inf for no lower limit"},
		{"imaginary part of a lower bound +Inf", lower(1, 0, complex(0, inf)),
			"blocks[1].bounds", "block 1 'z', entry 0", "the lower limit on the imaginary part is +Inf", "use -Inf for no lower limit"},
		{"upper bound -Inf", upper(0, 1, complex(-inf, 0)),
			"blocks[0].bounds", "block 0 'x', entry 1", "the upper limit on the value is -Inf", "use +Inf for no upper limit"},
		{"real part of an upper bound -Inf", upper(3, 1, complex(-inf, 1)),
			"blocks[3].bounds", "block 3 'H', entry 1", "the upper limit on the real part is -Inf", "use +Inf for no upper limit"},
		{"bounds crossed", lower(0, 0, 9.5),
			"blocks[0].bounds", "block 0 'x', entry 0", "the lower limit 9.5 on the value is above the upper limit 9", "exchange or correct them"},
		{"imaginary parts of bounds crossed", lower(1, 1, -1+2i),
			"blocks[1].bounds", "block 1 'z', entry 1", "the lower limit 2 on the imaginary part is above the upper limit 1", "exchange or correct them"},
		{"real parts of bounds crossed", upper(3, 1, -3+1i),
			"blocks[3].bounds", "block 3 'H', entry 1", "the lower limit -1 on the real part is above the upper limit -3", "exchange or correct them"},
		{"diagonal bounded in its imaginary part", upper(3, 0, 4+1i),
			"blocks[3].bounds", "block 3 'H', entry 0", "a real number has limits on its imaginary part", "leave the imaginary part of its limits zero"},
		{"real entry bounded in its imaginary part", lower(0, 0, -1i),
			"blocks[0].bounds", "block 0 'x', entry 0", "a real number has limits on its imaginary part", "leave the imaginary part of its limits zero"},
		{"imaginary limit NaN on a real entry", lower(0, 0, complex(0, nan)),
			"blocks[0].bounds", "block 0 'x', entry 0", "a real number has limits on its imaginary part", "leave the imaginary part of its limits zero"},
	})
}

func TestObjectiveRefused(t *testing.T) {
	const place, finite = "the objective", "send finite numbers"
	tryBroken(t, []broken{
		{"unknown sense", func(m *model.Model) { m.Objective.Sense = 2 },
			"objective.sense", place, "sense number 2 is unknown", "use minimize or maximize"},
		{"constant NaN", func(m *model.Model) { m.Objective.Const = nan },
			"objective.constant", place, "its constant is NaN", "send a finite number"},
		{"constant infinite", func(m *model.Model) { m.Objective.Const = -inf },
			"objective.constant", place, "its constant is -Inf", "send a finite number"},
		{"a coefficient is missing", func(m *model.Model) { m.Objective.Coef = m.Objective.Coef[:3] },
			"objective", place, "it has 4 columns and 3 coefficients", "give one coefficient per column"},
		{"column past the end", func(m *model.Model) { m.Objective.Col[3] = 18 },
			"objective", place, "column 18 does not exist; the model has 18 entries", "number entries through the blocks in order, from 0"},
		{"largest column", func(m *model.Model) { m.Objective.Col[0] = math.MaxUint32 },
			"objective", place, "column 4294967295 does not exist; the model has 18 entries", "number entries through the blocks in order, from 0"},
		{"column twice", func(m *model.Model) { m.Objective.Col[1] = 0 },
			"objective", place, "column 0 follows column 0", "sort the columns of a row and add up those that repeat"},
		{"columns out of order", func(m *model.Model) { m.Objective.Col[2] = 1 },
			"objective", place, "column 1 follows column 3", "sort the columns of a row and add up those that repeat"},
		{"coefficient NaN", func(m *model.Model) { m.Objective.Coef[3] = complex(0, nan) },
			"objective", place, "the coefficient on entry 1 of block 3 'H' is (0+NaNi)", finite},
		{"coefficient infinite", func(m *model.Model) { m.Objective.Col, m.Objective.Coef = []uint32{14}, []complex128{complex(inf, 0)} },
			"objective", place, "the coefficient on entry 1 of block 4 is (+Inf+0i)", finite},
		{"imaginary coefficient on a real entry", func(m *model.Model) { m.Objective.Coef[0] = 2 + 1i },
			"objective", place, "the coefficient (2+1i) on entry 0 of block 0 'x' has an imaginary part, but the entry and the sum are real", "make the coefficient real"},
		{"imaginary coefficient on a diagonal", func(m *model.Model) { m.Objective.Coef[2] = 1i },
			"objective", place, "the coefficient (0+1i) on entry 0 of block 3 'H' has an imaginary part, but the entry and the sum are real", "make the coefficient real"},
	})
}
