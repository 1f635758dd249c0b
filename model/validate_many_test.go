package model_test

import (
	"fmt"
	"math"
	"runtime"
	"strings"
	"testing"

	"towpath/model"
)

// Of many faults the first 20 are spelt out, in the order of the model, and the rest are counted.
func TestManyFaults(t *testing.T) {
	for _, c := range []struct{ faults, more int }{{2, 0}, {20, 0}, {21, 1}, {1000, 980}} {
		m := &model.Model{Blocks: []model.Block{{Name: "x", Rows: c.faults, Cols: 1}}}
		for k := range c.faults {
			m.Objective.Col, m.Objective.Coef = append(m.Objective.Col, uint32(k)), append(m.Objective.Coef, complex(nan, 0))
		}
		got := faultsOf(t, m)
		if len(got.Faults) != c.faults-c.more || got.More != c.more {
			t.Fatalf("%d faults: %d are given and %d counted", c.faults, len(got.Faults), got.More)
		}
		lines := strings.Split(got.Error(), "\n")
		for k := range got.Faults {
			if want := fmt.Sprintf("the objective: the coefficient on entry %d of block 0 'x' is (NaN+0i); send finite numbers", k); lines[k] != want {
				t.Errorf("line %d says\n%s\nwant\n%s", k, lines[k], want)
			}
		}
		if rest := lines[len(got.Faults):]; c.more > 0 && (len(rest) != 1 || rest[0] != fmt.Sprintf("and %d more faults", c.more)) || c.more == 0 && len(rest) != 0 {
			t.Errorf("%d faults: the last lines are %q", c.faults, rest)
		}
	}
}

// One fault does not hide those elsewhere; but where a block has no size, columns mean nothing and are not judged.
func TestFaultsOfEveryPart(t *testing.T) {
	m := harbour()
	m.Name = "\x00"
	m.Blocks[1].Bounds.Lower[3] = complex(nan, nan) // both parts are told
	m.Blocks[2].Name = "x"
	m.Blocks[5].Cone = model.PSD
	m.Objective.Sense = 7
	m.Objective.Coef[0] = 1i
	m.Constraints[0].Map.Conj.Start[2] = 9
	m.Constraints[3].Cone.Lower = nil
	m.Constraints[9].Map.Const = []complex128{1i, 0, complex(nan, 0)}
	want := []string{"name", "blocks[1].bounds", "blocks[1].bounds", "blocks[2].name", "blocks[5].cone", "objective.sense", "objective",
		"constraints[0].map.conj", "constraints[3].cone", "constraints[9].map.const", "constraints[9].map.const"}
	same := func(want []string) {
		t.Helper()
		var got []string
		for _, f := range faultsOf(t, m).Faults {
			got = append(got, f.Path)
		}
		if strings.Join(got, " ") != strings.Join(want, " ") {
			t.Errorf("faults of\n%v\nwant\n%v", got, want)
		}
	}
	same(want)
	m.Blocks[3].Rows = 0
	same([]string{"name", "blocks[1].bounds", "blocks[1].bounds", "blocks[2].name", "blocks[3].rows", "blocks[5].cone"})
}

// A name that is refused is not repeated in the places of other faults, where it could be long or unprintable.
func TestRefusedNamesAreNotShown(t *testing.T) {
	for _, name := range []string{long(1 << 20), "\xff\xfe", "\x1b[2J"} {
		m := harbour()
		m.Blocks[0].Name, m.Constraints[3].Name = name, name
		m.Blocks[0].Bounds.Lower[0] = 10
		m.Objective.Coef[0] = 1i
		m.Constraints[3].Cone.Upper[0] = complex(nan, 0)
		got := faultsOf(t, m)
		var places []string
		for _, f := range got.Faults {
			places = append(places, f.Place)
		}
		want := "block 0|block 0, entry 0|the objective|constraint 3|constraint 3, row 0"
		if strings.Join(places, "|") != want {
			t.Errorf("places %q, want %s", places, want)
		}
		if strings.Contains(got.Error(), name) {
			t.Errorf("the error repeats a name of %d bytes", len(name))
		}
	}
}

// Sizes are judged before anything of that size is made: refusing a hostile model takes next to no memory.
func TestHostileSizesTakeNoMemory(t *testing.T) {
	const allowed = 1 << 16
	for _, c := range []struct {
		name   string
		blocks []model.Block
	}{
		{"rows and columns overflow", []model.Block{{Rows: math.MaxInt, Cols: math.MaxInt}}},
		{"product overflows to zero", []model.Block{{Rows: 1 << 32, Cols: 1 << 32, Field: model.Complex}}},
		{"product overflows to below zero", []model.Block{{Rows: 1 << 62, Cols: 2}}},
		{"order above the largest", []model.Block{{Rows: model.MaxOrder + 1, Cols: model.MaxOrder + 1, Field: model.Hermitian}}},
		{"packed length overflows", []model.Block{{Rows: 1 << 33, Cols: 1 << 33, Field: model.Symmetric, Cone: model.PSD}}},
		{"sum overflows", []model.Block{{Rows: model.MaxEntries, Cols: 1}, {Rows: model.MaxEntries, Cols: 1}, {Rows: math.MaxInt, Cols: 1}}},
		{"bounds of a huge block are missing", []model.Block{{Rows: model.MaxEntries, Cols: 1, Bounds: &model.Bounds{}}}},
		{"least numbers", []model.Block{{Rows: math.MinInt, Cols: -1}}},
	} {
		t.Run(c.name, func(t *testing.T) {
			m := &model.Model{Blocks: c.blocks}
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			err := m.Validate()
			runtime.ReadMemStats(&after)
			if err == nil {
				t.Error("accepted")
			}
			if took := after.TotalAlloc - before.TotalAlloc; took > allowed {
				t.Errorf("took %d bytes, allowed %d", took, allowed)
			}
		})
	}
}
