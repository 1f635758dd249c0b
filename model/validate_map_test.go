package model_test

import (
	"math"
	"testing"

	"towpath/model"
)

const mapConesCure = "real rows may be in zero, nonneg, range, lorentz or rotated-lorentz, complex ones in zero, range, lorentz or rotated-lorentz, matrices in zero or psd"

func TestConstraintsRefused(t *testing.T) {
	cone := func(k int, kind model.ConeKind) func(m *model.Model) {
		return func(m *model.Model) { m.Constraints[k].Cone.Kind = kind }
	}
	lin := func(k int, matrix model.Matrix) func(m *model.Model) {
		return func(m *model.Model) { m.Constraints[k].Map.Lin = matrix }
	}
	tryBroken(t, []broken{
		{"unknown field", func(m *model.Model) { m.Constraints[2].Map.Field = 255 },
			"constraints[2].field", "constraint 2", "field number 255 is unknown", knownFields},
		{"unknown cone", cone(0, 200),
			"constraints[0].cone", "constraint 0 'balance'", "cone number 200 is unknown", "use zero, nonneg, range, lorentz, rotated-lorentz or psd"},
		{"real rows in free", cone(2, model.Free),
			"constraints[2].cone", "constraint 2", "real rows cannot lie in the cone free", mapConesCure},
		{"real rows in psd", cone(6, model.PSD),
			"constraints[6].cone", "constraint 6 'ball'", "real rows cannot lie in the cone psd", mapConesCure},
		{"real rows in a box", cone(2, model.Box),
			"constraints[2].cone", "constraint 2", "real rows cannot lie in the cone box", mapConesCure},
		{"complex rows in nonneg", cone(0, model.Nonneg),
			"constraints[0].cone", "constraint 0 'balance'", "complex rows cannot lie in the cone nonneg", mapConesCure},
		{"Hermitian rows in range", cone(8, model.Range),
			"constraints[8].cone", "constraint 8 'gram'", "hermitian rows cannot lie in the cone range", mapConesCure},
		{"symmetric rows in lorentz", cone(9, model.Lorentz),
			"constraints[9].cone", "constraint 9 'stress'", "symmetric rows cannot lie in the cone lorentz", mapConesCure},
		{"empty map", lin(6, model.Matrix{}),
			"constraints[6].map", "constraint 6 'ball'", "it has no rows", "leave it out, or give it rows"},
		{"map of no rows", lin(6, model.Matrix{Start: []int{0}}),
			"constraints[6].map", "constraint 6 'ball'", "it has no rows", "leave it out, or give it rows"},
		{"rows no triangle", lin(9, list([]uint32{7, 8})),
			"constraints[9].map", "constraint 9 'stress'", "2 rows are not the lower triangle of a matrix", "give order*(order+1)/2 rows"},
		{"rows a whole square", lin(10, list([]uint32{7, 8, 8, 9})),
			"constraints[10].map", "constraint 10 'twins'", "4 rows are not the lower triangle of a matrix", "give order*(order+1)/2 rows"},
		{"rotated cone of one row", lin(7, list([]uint32{13})),
			"constraints[7].map", "constraint 7 'bowl'", "a rotated lorentz cone has at least 2 rows", "give u, v and the rest"},
		{"fewer rows on conjugates", func(m *model.Model) { m.Constraints[0].Map.Conj = &model.Matrix{Start: []int{0, 0}} },
			"constraints[0].map.conj", "constraint 0 'balance'", "it has 2 rows of coefficients and 1 of coefficients on conjugates", "give as many of both"},
		{"no rows on conjugates", func(m *model.Model) { m.Constraints[8].Map.Conj = &model.Matrix{} },
			"constraints[8].map.conj", "constraint 8 'gram'", "it has 3 rows of coefficients and 0 of coefficients on conjugates", "give as many of both"},
		{"a constant is missing", func(m *model.Model) { m.Constraints[2].Map.Const = []complex128{1} },
			"constraints[2].map.const", "constraint 2", "it has 1 constants for 2 rows", "give one per row, or none"},
		{"constants of no length", func(m *model.Model) { m.Constraints[2].Map.Const = []complex128{} },
			"constraints[2].map.const", "constraint 2", "it has 0 constants for 2 rows", "give one per row, or none"},
	})
}

func TestMatricesRefused(t *testing.T) {
	const (
		ends  = "begin with 0 and end with the number of coefficients"
		rises = "give row starts that never fall"
		each  = "give one value per column"
		conj  = "constraint 0 'balance', coefficients on conjugates"
	)
	lin := func(by func(m *model.Matrix)) func(m *model.Model) {
		return func(m *model.Model) { by(&m.Constraints[2].Map.Lin) }
	}
	onConj := func(by func(m *model.Matrix)) func(m *model.Model) {
		return func(m *model.Model) { by(m.Constraints[0].Map.Conj) }
	}
	tryBroken(t, []broken{
		{"first row start is not 0", lin(func(m *model.Matrix) { m.Start[0] = 1 }),
			"constraints[2].map.lin", "constraint 2", "its row starts run from 1 to 3 for 3 coefficients", ends},
		{"last row start too small", lin(func(m *model.Matrix) { m.Start[2] = 2 }),
			"constraints[2].map.lin", "constraint 2", "its row starts run from 0 to 2 for 3 coefficients", ends},
		{"last row start too large", lin(func(m *model.Matrix) { m.Start[2] = math.MaxInt }),
			"constraints[2].map.lin", "constraint 2", "its row starts run from 0 to 9223372036854775807 for 3 coefficients", ends},
		{"row start past the end", lin(func(m *model.Matrix) { m.Start[1] = 4 }),
			"constraints[2].map.lin", "constraint 2", "row 1 begins at 4 and ends at 3", rises},
		{"row start negative", lin(func(m *model.Matrix) { m.Start[1] = -1 }),
			"constraints[2].map.lin", "constraint 2", "row 0 begins at 0 and ends at -1", rises},
		{"real and complex values", lin(func(m *model.Matrix) { m.Re = []float64{1, 2, 3} }),
			"constraints[2].map.lin", "constraint 2", "it has real and complex values", "give one of the two"},
		{"a value is missing", lin(func(m *model.Matrix) { m.Z = m.Z[:2] }),
			"constraints[2].map.lin", "constraint 2", "it has 3 columns and 2 values", each},
		{"no values", lin(func(m *model.Matrix) { m.Z = nil }),
			"constraints[2].map.lin", "constraint 2", "it has 3 columns and 0 values", each},
		{"row starts of conjugates end early", onConj(func(m *model.Matrix) { m.Start[2] = 2 }),
			"constraints[0].map.conj", conj, "its row starts run from 0 to 2 for 3 coefficients", ends},
		{"row start of conjugates falls", onConj(func(m *model.Matrix) { m.Start[1] = 7 }),
			"constraints[0].map.conj", conj, "row 1 begins at 7 and ends at 3", rises},
		{"real and complex values on conjugates", onConj(func(m *model.Matrix) { m.Z = []complex128{1, 2, 3} }),
			"constraints[0].map.conj", conj, "it has real and complex values", "give one of the two"},
		{"a value too many on conjugates", onConj(func(m *model.Matrix) { m.Re = append(m.Re, 1) }),
			"constraints[0].map.conj", conj, "it has 3 columns and 4 values", each},
	})
}

func TestRowsRefused(t *testing.T) {
	const (
		order  = "sort the columns of a row and add up those that repeat"
		finite = "send finite numbers"
		reals  = "make the coefficient real"
	)
	constant := func(k, row int, x complex128) func(m *model.Model) {
		return func(m *model.Model) { m.Constraints[k].Map.Const[row] = x }
	}
	complexRows := func(k int, values ...complex128) func(m *model.Model) {
		return func(m *model.Model) { m.Constraints[k].Map.Lin.Re, m.Constraints[k].Map.Lin.Z = nil, values }
	}
	tryBroken(t, []broken{
		{"column past the end", func(m *model.Model) { m.Constraints[3].Map.Lin.Col[1] = 18 },
			"constraints[3].map.lin", "constraint 3 'limits', row 1", "column 18 does not exist; the model has 18 entries", "number entries through the blocks in order, from 0"},
		{"column twice in a row", func(m *model.Model) { m.Constraints[2].Map.Lin.Col[1] = 0 },
			"constraints[2].map.lin", "constraint 2, row 0", "column 0 follows column 0", order},
		{"columns out of order", func(m *model.Model) { m.Constraints[0].Map.Lin.Col[0] = 5 },
			"constraints[0].map.lin", "constraint 0 'balance', row 0", "column 3 follows column 5", order},
		{"conjugate of a column past the end", func(m *model.Model) { m.Constraints[0].Map.Conj.Col[2] = math.MaxUint32 },
			"constraints[0].map.conj", "constraint 0 'balance', row 1, coefficients on conjugates", "column 4294967295 does not exist; the model has 18 entries", "number entries through the blocks in order, from 0"},
		{"conjugates out of order", func(m *model.Model) { m.Constraints[0].Map.Conj.Col[2] = 3 },
			"constraints[0].map.conj", "constraint 0 'balance', row 1, coefficients on conjugates", "column 3 follows column 4", order},
		{"conjugate of a real entry", func(m *model.Model) { m.Constraints[0].Map.Conj.Col[0] = 1 },
			"constraints[0].map.conj", "constraint 0 'balance', row 0, coefficients on conjugates", "entry 1 of block 0 'x' is real and has a coefficient on its conjugate", "add it to the plain coefficient"},
		{"conjugate of a diagonal entry", func(m *model.Model) { m.Constraints[0].Map.Conj.Col[2] = 12 },
			"constraints[0].map.conj", "constraint 0 'balance', row 1, coefficients on conjugates", "entry 2 of block 3 'H' is real and has a coefficient on its conjugate", "add it to the plain coefficient"},
		{"coefficient NaN", func(m *model.Model) { m.Constraints[4].Map.Lin.Re[2] = nan },
			"constraints[4].map.lin", "constraint 4 'disc', row 2", "the coefficient on entry 1 of block 1 'z' is (NaN+0i)", finite},
		{"coefficient infinite", complexRows(9, 1, 1, complex(1, -inf)),
			"constraints[9].map.lin", "constraint 9 'stress', row 2", "the coefficient on entry 2 of block 2 'S' is (1-Infi)", finite},
		{"conjugate's coefficient infinite", func(m *model.Model) { m.Constraints[0].Map.Conj.Re[1] = inf },
			"constraints[0].map.conj", "constraint 0 'balance', row 1, coefficients on conjugates", "the coefficient on entry 1 of block 1 'z' is (+Inf+0i)", finite},
		{"imaginary coefficient in a real row", func(m *model.Model) { m.Constraints[2].Map.Lin.Z[0] = 1 + 1e-9i },
			"constraints[2].map.lin", "constraint 2, row 0", "the coefficient (1+1e-09i) on entry 0 of block 0 'x' has an imaginary part, but the entry and the sum are real", reals},
		{"imaginary coefficient in the head of a cone", complexRows(4, 1i, 1i, 1i),
			"constraints[4].map.lin", "constraint 4 'disc', row 0", "the coefficient (0+1i) on entry 0 of block 0 'x' has an imaginary part, but the entry and the sum are real", reals},
		{"imaginary coefficient in the second head", complexRows(5, 1, 2i, 1i),
			"constraints[5].map.lin", "constraint 5 'product', row 1", "the coefficient (0+2i) on entry 1 of block 0 'x' has an imaginary part, but the entry and the sum are real", reals},
		{"imaginary coefficient on a diagonal row", complexRows(10, 1, 1, 1-1i),
			"constraints[10].map.lin", "constraint 10 'twins', row 2", "the coefficient (1-1i) on entry 2 of block 2 'S' has an imaginary part, but the entry and the sum are real", reals},
		{"constant NaN", constant(0, 1, complex(0, nan)),
			"constraints[0].map.const", "constraint 0 'balance', row 1", "the constant is (0+NaNi)", finite},
		{"constant infinite", constant(2, 0, complex(-inf, 0)),
			"constraints[2].map.const", "constraint 2, row 0", "the constant is (-Inf+0i)", finite},
		{"constant of a real row", constant(2, 1, 2+1i),
			"constraints[2].map.const", "constraint 2, row 1", "the row is real and its constant has an imaginary part", "make the constant real"},
		{"constant of a head", func(m *model.Model) { m.Constraints[5].Map.Const = []complex128{1, 1i, 1i} },
			"constraints[5].map.const", "constraint 5 'product', row 1", "the row is real and its constant has an imaginary part", "make the constant real"},
		{"constant on a diagonal", constant(8, 2, 1+1i),
			"constraints[8].map.const", "constraint 8 'gram', row 2", "the row is on the diagonal of a Hermitian matrix and its constant has an imaginary part", "make the constant real"},
	})
}

func TestLimitsRefused(t *testing.T) {
	const each = "give one of each per row, infinite where there is none"
	limits := func(k, row int, lower, upper complex128) func(m *model.Model) {
		return func(m *model.Model) {
			m.Constraints[k].Cone.Lower[row], m.Constraints[k].Cone.Upper[row] = lower, upper
		}
	}
	tryBroken(t, []broken{
		{"lower limits on zero rows", func(m *model.Model) { m.Constraints[0].Cone.Lower = []complex128{0, 0} },
			"constraints[0].cone", "constraint 0 'balance'", "it has limits but lies in the cone zero", "leave the limits out, or use the cone range"},
		{"upper limits on psd", func(m *model.Model) { m.Constraints[8].Cone.Upper = []complex128{} },
			"constraints[8].cone", "constraint 8 'gram'", "it has limits but lies in the cone psd", "leave the limits out, or use the cone range"},
		{"no limits", func(m *model.Model) { m.Constraints[3].Cone = model.Cone{Kind: model.Range} },
			"constraints[3].cone", "constraint 3 'limits'", "it has 0 lower and 0 upper limits for 2 rows", each},
		{"an upper limit is missing", func(m *model.Model) { m.Constraints[1].Cone.Upper = []complex128{1} },
			"constraints[1].cone", "constraint 1 'window'", "it has 2 lower and 1 upper limits for 2 rows", each},
		{"limit NaN", limits(3, 1, complex(nan, 0), 1),
			"constraints[3].cone", "constraint 3 'limits', row 1", "a limit on the value is NaN", noLimit},
		{"imaginary part of a limit NaN", limits(1, 0, 0, complex(1, nan)),
			"constraints[1].cone", "constraint 1 'window', row 0", "a limit on the imaginary part is NaN", noLimit},
		{"lower limit +Inf", limits(3, 0, complex(inf, 0), complex(inf, 0)),
			"constraints[3].cone", "constraint 3 'limits', row 0", "the lower limit on the value is +Inf", "use -Inf for no lower limit"},
		{"upper limit -Inf", limits(1, 1, below, complex(-inf, 0)),
			"constraints[1].cone", "constraint 1 'window', row 1", "the upper limit on the real part is -Inf", "use +Inf for no upper limit"},
		{"limits crossed", limits(1, 1, 2+2i, 2+1.5i),
			"constraints[1].cone", "constraint 1 'window', row 1", "the lower limit 2 on the imaginary part is above the upper limit 1.5", "exchange or correct them"},
		{"imaginary limit on a real row", limits(3, 0, complex(0, inf), 1),
			"constraints[3].cone", "constraint 3 'limits', row 0", "a real number has limits on its imaginary part", "leave the imaginary part of its limits zero"},
		{"real row without limits", limits(3, 1, complex(-inf, 0), complex(inf, 0)),
			"constraints[3].cone", "constraint 3 'limits', row 1", "it has neither a lower nor an upper limit", "leave the row out"},
		{"complex row without limits", limits(1, 1, below, above),
			"constraints[1].cone", "constraint 1 'window', row 1", "it has neither a lower nor an upper limit", "leave the row out"},
	})
}
