package interior

import (
	"context"
	"fmt"
	"math/rand/v2"
	"testing"

	"towpath/backends"
	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
)

// phases is the relaxation of a phase retrieval (I. Waldspurger, A. d'Aspremont, S. Mallat 2015, from memory): minimize
// tr(M U) over Hermitian positive semidefinite U of order n with ones on the diagonal, M random and definite.
func phases(n int) *model.Model {
	rng := rand.New(rand.NewPCG(9, uint64(n)))
	m := &model.Model{Blocks: []model.Block{{Name: "U", Field: model.Hermitian, Rows: n, Cols: n, Cone: model.PSD}}}
	for k := range model.PackedLen(n) {
		i, j := model.PackedAt(n, k)
		z := complex(2*rng.NormFloat64(), 2*rng.NormFloat64())
		if i == j {
			z = complex(float64(n), 0)
			m.Constraints = append(m.Constraints, model.Constraint{Cone: model.Cone{Kind: model.Zero}, Map: model.Map{
				Lin: model.Matrix{Start: []int{0, 1}, Col: []uint32{uint32(k)}, Re: []float64{1}}, Const: []complex128{-1}}})
		}
		m.Objective.Col, m.Objective.Coef = append(m.Objective.Col, uint32(k)), append(m.Objective.Coef, z)
	}
	return m
}

// BenchmarkNativeAndLowered solves the same Hermitian programs natively and over the bridges to real matrices of twice the
// order. The ratio of the two is what routing natively is worth.
func BenchmarkNativeAndLowered(b *testing.B) {
	var rules []capability.Rule
	for _, r := range bridges.All() {
		rules = append(rules, r)
	}
	for _, n := range []int{10, 20, 40, 80} {
		m := phases(n)
		for _, sheet := range New().Sheets() {
			p := capability.Plan(capability.Summarize(m), rules, []*capability.Sheet{&sheet}, capability.Options{})[0]
			x, err := bridges.Cross(m, p.Route, bridges.All())
			if err != nil {
				b.Fatal(err)
			}
			b.Run(fmt.Sprint(n, "/", sheet.Name), func(b *testing.B) {
				for b.Loop() {
					a, err := New().Solve(context.Background(), sheet.Name, x.Lowered, backends.Options{})
					if err != nil || a.Outcome != model.Optimal {
						b.Fatal(a, err)
					}
				}
			})
		}
	}
}
