package archipelago

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"towpath/model"
)

// The closed forms are checked without a solver: a point that attains the value and satisfies the model, and that the
// multipliers (or many random points) leave nothing better.

func value(m *model.Model, x []complex128) float64 {
	f := m.Objective.Const
	for k, col := range m.Objective.Col {
		f += real(m.Objective.Coef[k] * x[col])
	}
	return f
}

func evaluate(c *model.Constraint, x []complex128) []complex128 {
	out := make([]complex128, c.Map.Rows())
	for r := range out {
		out[r] = c.Map.ConstAt(r)
		for p := c.Map.Lin.Start[r]; p < c.Map.Lin.Start[r+1]; p++ {
			out[r] += c.Map.Lin.At(p) * x[c.Map.Lin.Col[p]]
		}
	}
	return out
}

func near(a, b float64) bool { return math.Abs(a-b) <= 1e-12*(1+math.Abs(b)) }

func TestSquareRootMeasurementAttainsAndNothingExceeds(t *testing.T) {
	c := pulses()
	basis := interferometer()
	var x []complex128
	for k := range letters {
		mu := make([]complex128, letters) // rho^(-1/2) psi_k / 2 before the interferometer
		for j := range mu {
			mu[j] = cmplx.Rect(1/math.Sqrt(letters), 2*math.Pi*float64(j*k)/letters)
		}
		mu = basis.times(mu)
		for e := range model.PackedLen(letters) {
			i, j := model.PackedAt(letters, e)
			x = append(x, mu[i]*cmplx.Conj(mu[j]))
		}
	}
	if got := value(c.Model, x); !near(got, c.Known.Objective) {
		t.Errorf("the square-root measurement succeeds with %v, want %v", got, c.Known.Objective)
	}
	for r, z := range evaluate(&c.Model.Constraints[0], x) {
		if cmplx.Abs(z) > 1e-14 {
			t.Errorf("row %d is %v, want 0", r, z)
		}
	}
	// Any measurement: sum tr(rho_k E_k)/4 <= sum tr(K E_k) = tr K when K - rho_k/4 is positive semidefinite.
	k := c.Known.Multipliers[0]
	trace := 0.0
	for i := range letters {
		trace += real(k[model.PackedIndex(letters, i, i)])
	}
	if !near(trace, c.Known.Objective) {
		t.Errorf("the multiplier's trace is %v, want %v", trace, c.Known.Objective)
	}
	size := model.PackedLen(letters)
	for b := range letters {
		s := newSquare(letters)
		for e := range size {
			i, j := model.PackedAt(letters, e)
			z := k[e]
			// A coefficient of the objective is the conjugate of rho_k/4, twice off the diagonal.
			coef := cmplx.Conj(c.Model.Objective.Coef[b*size+e])
			if i != j {
				coef /= 2
			}
			s[i][j], s[j][i] = z-coef, cmplx.Conj(z-coef)
		}
		if least := smallestPivot(s); least < -1e-13 {
			t.Errorf("K - rho_%d/4 is not positive semidefinite: pivot %v", b, least)
		}
	}
}

// smallestPivot eliminates a Hermitian matrix shifted by a little more than rounding.
func smallestPivot(a square) float64 {
	least := math.Inf(1)
	for i := range a {
		a[i][i] += 1e-13
	}
	for k := range a {
		least = min(least, real(a[k][k]))
		for i := k + 1; i < len(a); i++ {
			f := a[i][k] / a[k][k]
			for j := k; j < len(a); j++ {
				a[i][j] -= f * a[k][j]
			}
		}
	}
	return least
}

func TestChebyshevWeightsAttain(t *testing.T) {
	c := sidelobes()
	const n, edge, sine = 10, 0.9, 0.35
	x0 := 1 / math.Cos(edge/2)
	chebyshev := func(x float64) float64 { // T_9 by its recurrence
		a, b := 1.0, x
		for range n - 2 {
			a, b = b, 2*x*b-a
		}
		return b
	}
	x := make([]complex128, 1+n)
	x[0] = complex(1/chebyshev(x0), 0)
	for k := range n {
		for m := range n {
			u := 2 * math.Pi * float64(m) / n
			p := cmplx.Rect(chebyshev(x0*math.Cos(u/2)), (n-1)*u/2)
			x[1+k] += p * cmplx.Rect(1./n, -float64(k)*u)
		}
		x[1+k] *= wanted * x[0] * cmplx.Rect(1, math.Pi*float64(k)*sine)
	}
	if !near(real(x[0]), c.Known.Objective) {
		t.Errorf("level %v, want %v", c.Known.Objective, real(x[0]))
	}
	if z := evaluate(&c.Model.Constraints[0], x)[0]; cmplx.Abs(z) > 1e-12 {
		t.Errorf("response off by %v", z)
	}
	touching := 0
	for _, l := range c.Model.Constraints[1:] {
		rows := evaluate(&l, x)
		slack := real(rows[0]) - cmplx.Abs(rows[1])
		if slack < -1e-12 {
			t.Errorf("%s exceeds the level by %v", l.Name, -slack)
		}
		if slack < 1e-9 {
			touching++
		}
	}
	if touching != n {
		t.Errorf("%d bearings touch the level, want %d", touching, n)
	}
	// No other weights do better.
	rng := rand.New(rand.NewPCG(4, 4))
	for range 2000 {
		y := make([]complex128, 1+n)
		for k := range n {
			y[1+k] = x[1+k] + complex(rng.NormFloat64(), rng.NormFloat64())*1e-3
		}
		response := evaluate(&c.Model.Constraints[0], y)[0] + wanted
		loudest := 0.0
		for _, l := range c.Model.Constraints[1:] {
			loudest = max(loudest, cmplx.Abs(evaluate(&l, y)[1]/response))
		}
		if loudest < c.Known.Objective*(1-1e-12) {
			t.Fatalf("level %v reached, below %v", loudest, c.Known.Objective)
		}
	}
}

// A point of the affine set a^H w = wanted is nearest to the origin under the norm ||B w|| exactly when B^H B w is a
// multiple of a; that multiple is the squared optimum times the phase.
func TestMinimumVarianceIsMinimal(t *testing.T) {
	c := ferries()
	response, power := &c.Model.Constraints[0].Map.Lin, &c.Model.Constraints[1].Map.Lin
	n := c.Model.Blocks[1].Entries()
	gram := newSquare(n)
	for r := 1; r < power.Rows(); r++ {
		for p := power.Start[r]; p < power.Start[r+1]; p++ {
			for q := power.Start[r]; q < power.Start[r+1]; q++ {
				gram[power.Col[p]-1][power.Col[q]-1] += cmplx.Conj(power.At(p)) * power.At(q)
			}
		}
	}
	a := make([]complex128, n)
	for p, col := range response.Col {
		a[col-1] = cmplx.Conj(response.At(p))
	}
	scale := complex(c.Known.Objective*c.Known.Objective, 0) * wanted
	target := make([]complex128, n)
	for k := range a {
		target[k] = a[k] * scale
	}
	kept := newSquare(n)
	for i := range kept {
		copy(kept[i], gram[i])
	}
	w := gram.solve(append([]complex128(nil), target...))
	for k, z := range kept.times(w) {
		if cmplx.Abs(z-target[k]) > 1e-12 {
			t.Errorf("row %d of B^H B w is %v, want %v", k, z, target[k])
		}
	}
	x := append([]complex128{complex(c.Known.Objective, 0)}, w...)
	if z := evaluate(&c.Model.Constraints[0], x)[0]; cmplx.Abs(z) > 1e-12 {
		t.Errorf("response off by %v", z)
	}
	sum := 0.0
	for _, z := range evaluate(&c.Model.Constraints[1], x)[1:] {
		sum += real(z)*real(z) + imag(z)*imag(z)
	}
	if !near(math.Sqrt(sum), c.Known.Objective) {
		t.Errorf("amplitude %v, want %v", math.Sqrt(sum), c.Known.Objective)
	}
}

func TestCasesAreComplete(t *testing.T) {
	cases, err := Cases()
	if err != nil {
		t.Fatal(err)
	}
	seen := map[string]bool{}
	for _, c := range cases {
		if seen[c.ID] || c.ID == "" || c.Story == "" || c.Model.Name == "" {
			t.Errorf("case %q: every case needs an id of its own, a story and a named model", c.ID)
		}
		seen[c.ID] = true
		if err := c.Model.Validate(); err != nil {
			t.Errorf("case %s: %v", c.ID, err)
		}
	}
	for _, id := range []string{"grid-cones", "grid-matrix", "pulses", "sidelobes", "ferries"} {
		if !seen[id] {
			t.Errorf("no case %q", id)
		}
	}
}
