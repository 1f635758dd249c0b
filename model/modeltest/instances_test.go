package modeltest

import (
	"testing"

	"towpath/model"
)

func TestCasesLoad(t *testing.T) {
	cases, err := Cases()
	if err != nil {
		t.Fatal(err)
	}
	if len(cases) != 82 {
		t.Errorf("%d cases, want 82", len(cases))
	}
	for _, c := range cases {
		if c.Source == "" {
			t.Errorf("%s has no source", c.ID)
		}
		for name, v := range c.Dual {
			if k := constraint(c.Model, name); k < 0 {
				t.Errorf("%s: a multiplier is known for %q, which is no constraint", c.ID, name)
			} else if n := c.Model.Constraints[k].Map.Rows(); len(v) != n {
				t.Errorf("%s: %d multipliers are known for %q, which has %d rows", c.ID, len(v), name, n)
			}
		}
		for name, v := range c.Primal {
			found := false
			for k := range c.Model.Blocks {
				b := &c.Model.Blocks[k]
				found = found || b.Name == name && b.Entries() == len(v)
			}
			if !found {
				t.Errorf("%s: no block %q has %d entries", c.ID, name, len(v))
			}
		}
	}
}

func constraint(m *model.Model, name string) int {
	for k := range m.Constraints {
		if m.Constraints[k].Name == name {
			return k
		}
	}
	return -1
}
