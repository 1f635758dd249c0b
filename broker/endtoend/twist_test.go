package endtoend

import (
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"towpath/backends/interior"
	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"
)

// TestTwists turns the published instances without changing what they say: every complex equality by a phase of its own, every
// Hermitian matrix map by a unitary congruence. Values stay; the multiplier of an equality turns by the phase, that of a map
// becomes U Y U^H. Lowered, a turned equality is two rows that each mix real and imaginary part, and a dense U leaves no zero.
func TestTwists(t *testing.T) {
	if testing.Short() {
		t.Skip("takes long")
	}
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	s := newStation(t)
	ways := []way{
		{"native", &towpathv1.JobOptions{Sheet: interior.ComplexSheet}, exactWay},
		{"real only", &towpathv1.JobOptions{Sheet: interior.RealSheet}, exactWay},
	}
	if s.csdp {
		ways = append(ways, way{"csdp", &towpathv1.JobOptions{Backends: []string{"csdp"}}, csdpWay})
	}
	turned := 0
	for i := range cases {
		c := twisted(&cases[i], rand.New(rand.NewPCG(6, uint64(i))))
		if c == nil || c.Status != "optimal" || c.Pathological {
			continue
		}
		turned++
		for _, w := range ways {
			t.Run(w.name+"/"+c.ID, func(t *testing.T) {
				sent, a := s.solve(t, c.Model, w.options)
				judge(t, c, w.accuracy, sent, a)
			})
		}
	}
	if turned < 30 {
		t.Errorf("only %d instances could be turned", turned)
	}
}

// twisted is the case with all its complex equalities and Hermitian maps turned, nil when there are none or when they are
// large.
func twisted(c *modeltest.Case, rng *rand.Rand) *modeltest.Case {
	out := *c
	out.Model = modeltest.Copy(c.Model)
	out.Dual = map[string][]complex128{}
	for name, y := range c.Dual {
		out.Dual[name] = y
	}
	done := false
	for k := range out.Model.Constraints {
		con := &out.Model.Constraints[k]
		w := &work{out.Model, termsOf(out.Model, con)}
		y, known := c.Dual[con.Name]
		switch {
		case con.Map.Field == model.Complex && con.Cone.Kind == model.Zero:
			var turnedY []complex128
			for r := range w.rows {
				phase := cmplx.Exp(complex(0, 1+5*rng.Float64()))
				w.rows[r] = w.rows[r].times(phase)
				if known {
					turnedY = append(turnedY, phase*y[r])
				}
			}
			w.put(con, model.Complex, w.rows)
			if known {
				out.Dual[con.Name] = turnedY
			}
		case con.Map.Field == model.Hermitian && (con.Cone.Kind == model.PSD || con.Cone.Kind == model.Zero):
			n, _ := model.PackedOrder(len(w.rows))
			if n > 12 {
				return nil
			}
			u := unitary(n, rng)
			w.put(con, model.Hermitian, congruence(u, w.rows))
			if known {
				out.Dual[con.Name] = congruenceOf(u, y)
			}
		default:
			continue
		}
		done = true
	}
	if !done {
		return nil
	}
	return &out
}

// unitary is a product of random phases and one Householder reflection: dense.
func unitary(n int, rng *rand.Rand) [][]complex128 {
	v, norm := make([]complex128, n), 0.0
	for i := range v {
		v[i] = complex(rng.NormFloat64(), rng.NormFloat64())
		norm += real(v[i])*real(v[i]) + imag(v[i])*imag(v[i])
	}
	u := make([][]complex128, n)
	for i := range u {
		phase := cmplx.Exp(complex(0, 6*rng.Float64()))
		u[i] = make([]complex128, n)
		for j := range u[i] {
			u[i][j] = -2 * v[i] * cmplx.Conj(v[j]) / complex(norm, 0)
			if i == j {
				u[i][j]++
			}
			u[i][j] *= phase
		}
	}
	return u
}

// congruence is U F U^H for the packed rows of a Hermitian map.
func congruence(u [][]complex128, packed []row) []row {
	n := len(u)
	out := make([]row, len(packed))
	for k := range out {
		i, j := model.PackedAt(n, k)
		sum := row{map[uint32]complex128{}, map[uint32]complex128{}, 0}
		for a := range n {
			for b := range n {
				f := packed[model.PackedIndex(n, max(a, b), min(a, b))]
				switch {
				case a < b:
					f = f.conjugated()
				case a == b: // a diagonal row means its real part
					f = f.re()
				}
				sum = sum.plus(f.times(u[i][a] * cmplx.Conj(u[j][b])))
			}
		}
		out[k] = sum
	}
	return out
}

func congruenceOf(u [][]complex128, packed []complex128) []complex128 {
	n := len(u)
	out := make([]complex128, len(packed))
	for k := range out {
		i, j := model.PackedAt(n, k)
		for a := range n {
			for b := range n {
				y := packed[model.PackedIndex(n, max(a, b), min(a, b))]
				if a < b {
					y = cmplx.Conj(y)
				}
				out[k] += u[i][a] * y * cmplx.Conj(u[j][b])
			}
		}
	}
	return out
}
