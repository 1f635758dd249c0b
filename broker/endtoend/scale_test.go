package endtoend

import (
	"math"
	"math/rand/v2"
	"testing"

	"towpath/backends/interior"
	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"
)

// TestUnits writes the published instances in other units: every constraint times a power of ten of its own, the objective
// times another. Values grow with the objective, the multiplier of a constraint with the objective over its own unit.
func TestUnits(t *testing.T) {
	if testing.Short() {
		t.Skip("takes long")
	}
	cases, err := modeltest.Cases()
	if err != nil {
		t.Fatal(err)
	}
	s := newStation(t)
	for i := range cases {
		c := &cases[i]
		if c.Status != "optimal" || c.Pathological || c.Tolerance > 1e-5 {
			continue
		}
		in := inUnits(c, rand.New(rand.NewPCG(10, uint64(i))))
		for _, sheet := range []string{interior.ComplexSheet, interior.RealSheet} {
			t.Run(sheet+"/"+c.ID, func(t *testing.T) {
				sent, a := s.solve(t, in.Model, &towpathv1.JobOptions{Sheet: sheet})
				judge(t, in, accuracy{value: 1e-6, multiplier: 1e-4, point: 1e-3}, sent, a)
			})
		}
	}
}

// inUnits is the case in other units.
func inUnits(c *modeltest.Case, rng *rand.Rand) *modeltest.Case {
	out := *c
	out.Model = modeltest.Copy(c.Model)
	unit := func() float64 { return math.Pow(10, float64(rng.IntN(5)-2)) }
	price := unit()
	out.Value *= price
	out.Tolerance *= max(1, price)
	o := &out.Model.Objective
	o.Const *= price
	for k := range o.Coef {
		o.Coef[k] *= complex(price, 0)
	}
	out.Dual = map[string][]complex128{}
	for k := range out.Model.Constraints {
		con := &out.Model.Constraints[k]
		u := unit()
		scale := func(m *model.Matrix) {
			for p := range m.Re {
				m.Re[p] *= u
			}
			for p := range m.Z {
				m.Z[p] *= complex(u, 0)
			}
		}
		scale(&con.Map.Lin)
		if con.Map.Conj != nil {
			scale(con.Map.Conj)
		}
		for _, list := range [][]complex128{con.Map.Const, con.Cone.Lower, con.Cone.Upper} {
			for r := range list {
				list[r] *= complex(u, 0)
			}
		}
		if y, known := c.Dual[con.Name]; known {
			for _, v := range y {
				out.Dual[con.Name] = append(out.Dual[con.Name], v*complex(price/u, 0))
			}
		}
	}
	return &out
}
