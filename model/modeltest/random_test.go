package modeltest_test

import (
	"testing"

	"towpath/model"
	"towpath/model/check"
	"towpath/model/modeltest"
)

// recipes runs over outcomes and properties.
func recipes(n int) []modeltest.Recipe {
	var out []modeltest.Recipe
	for seed := range uint64(n) {
		for _, outcome := range []model.Outcome{model.Optimal, model.Infeasible, model.Unbounded} {
			out = append(out, modeltest.Recipe{Seed: seed, Outcome: outcome, Linear: seed%4 == 0, Degenerate: seed%3 == 0, Spread: float64(seed % 3)})
		}
	}
	return out
}

// The examiner, which knows nothing of how the models are made, finds every answer right and valid.
func TestRandomAnswersAreRight(t *testing.T) {
	for _, r := range recipes(300) {
		m, a := r.Make()
		if err := m.Validate(); err != nil {
			t.Fatalf("%s: %v", r, err)
		}
		if e := check.Examine(m, a, check.Tolerances{}); e.Verdict != check.Checked {
			t.Errorf("%s: %s: %s", r, e.Verdict, e.Reasons)
		}
	}
}

func TestRandomModelsCoverEveryKind(t *testing.T) {
	type kind struct {
		field model.Field
		cone  model.ConeKind
	}
	blocks, maps := map[kind]int{}, map[kind]int{}
	bounds := map[model.Field]int{}
	for _, r := range recipes(300) {
		m, _ := r.Make()
		for b := range m.Blocks {
			blocks[kind{m.Blocks[b].Field, m.Blocks[b].Cone}]++
			if m.Blocks[b].Bounds != nil {
				bounds[m.Blocks[b].Field]++
			}
		}
		for k := range m.Constraints {
			maps[kind{m.Constraints[k].Map.Field, m.Constraints[k].Cone.Kind}]++
		}
	}
	if len(blocks) != 9 || len(maps) != 13 || len(bounds) != 4 {
		t.Errorf("%d kinds of blocks, %d of maps, %d of bounds: %v %v %v", len(blocks), len(maps), len(bounds), blocks, maps, bounds)
	}
}
