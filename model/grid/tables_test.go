package grid_test

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"towpath/model/grid"
)

// TestOpenNetworksLoad reads every network of the outside data and builds every relaxation of it.
func TestOpenNetworksLoad(t *testing.T) {
	root := os.Getenv("TOWPATH_CHECK_DATA")
	if root == "" {
		t.Skip("TOWPATH_CHECK_DATA is not set: the open power networks are NOT read; set it to the folder that holds grid/case14_ieee.json")
	}
	files, err := filepath.Glob(filepath.Join(root, "grid", "case*.json"))
	if err != nil || len(files) == 0 {
		t.Fatalf("no networks in %s: %v", root, err)
	}
	for _, file := range files {
		f, err := os.Open(file)
		if err != nil {
			t.Fatal(err)
		}
		n, err := grid.Read(f)
		f.Close()
		if err != nil {
			t.Error(err)
			continue
		}
		for _, r := range []grid.Relaxation{grid.SecondOrder, grid.Pairwise, grid.Semidefinite} {
			m, err := grid.Relax(n, r)
			if err != nil {
				t.Error(err)
				continue
			}
			if err := m.Validate(); err != nil {
				t.Errorf("%s: %v", m.Name, err)
			}
			balances := 0
			for _, c := range m.Constraints {
				if strings.HasPrefix(c.Name, "power balance at bus ") {
					balances++
				}
			}
			if balances != len(n.Buses) {
				t.Errorf("%s: %d balances for %d buses", m.Name, balances, len(n.Buses))
			}
		}
	}
}
