package bridges_test

import (
	"testing"

	"towpath/bridges"
	"towpath/bridges/bridgetest"
	"towpath/model"
)

// The law of execution needs an engine, which is a layer above: it is tried in backends/interior.
func TestLaws(t *testing.T) {
	bridgetest.Run(t, bridges.All(), nil)
}

// The published warning of an embedding with equal signs off the diagonal, [[A, B], [B, A]]: it is invisible to
// objectives. H = [[2, 1-i], [1+i, 3]] has eigenvalues 1 and 4, and must go over to a symmetric matrix with 1, 1, 4, 4.
func TestHermitianEmbeddingKeepsEigenvalues(t *testing.T) {
	for _, b := range bridges.All() {
		if b.ID() != "hermitian-psd-map/real-2n" {
			continue
		}
		h := []complex128{2, 1 + 1i, 3}
		low := b.Lower(bridges.Item{Kind: b.From(), Rows: 3, Cone: model.Cone{Kind: model.PSD}})
		im := low.Constraints[0]
		s := make([][]float64, 4)
		for i := range s {
			s[i] = make([]float64, 4)
		}
		for r := range im.Rows {
			i, j := model.PackedAt(4, r)
			for p := im.Of.Lin.Start[r]; p < im.Of.Lin.Start[r+1]; p++ {
				s[i][j] += real(im.Of.Lin.At(p) * h[im.Of.Lin.Col[p]])
			}
			s[j][i] = s[i][j]
		}
		// (S - I)(S - 4I) = 0 says that there are no other eigenvalues, the trace 10 that each comes twice.
		trace := 0.0
		for i := range s {
			trace += s[i][i]
			for j := range s {
				sum := 0.0
				for k := range s {
					sum += (s[i][k] - unit(i, k)) * (s[k][j] - 4*unit(k, j))
				}
				if sum != 0 {
					t.Errorf("(S - I)(S - 4I) has %g in row %d, column %d; S = %v", sum, i, j, s)
				}
			}
		}
		if trace != 10 {
			t.Errorf("trace %g", trace)
		}
		return
	}
	t.Fatal("the bridge is gone")
}

func unit(i, j int) float64 {
	if i == j {
		return 1
	}
	return 0
}
