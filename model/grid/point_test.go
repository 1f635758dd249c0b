package grid_test

import (
	"fmt"
	"math/cmplx"
	"testing"

	"towpath/model"
	"towpath/model/grid"
)

func name(format string, a ...any) string { return fmt.Sprintf(format, a...) }

func square(z complex128) float64 { return real(z)*real(z) + imag(z)*imag(z) }

// operatingPoint fills a relaxation of the sample with the voltages of an AC operating point.
func operatingPoint(t *testing.T, m *model.Model, n *grid.Network, v map[int]complex128, power []complex128) []complex128 {
	t.Helper()
	var live []complex128
	for _, b := range n.Buses {
		if b.Kind != 4 {
			live = append(live, v[b.ID])
		}
	}
	var x []complex128
	for _, b := range m.Blocks {
		switch b.Name {
		case grid.SquaredVoltage:
			for _, u := range live {
				x = append(x, complex(square(u), 0))
			}
		case grid.VoltageProduct:
			if b.Field == model.Hermitian {
				for k := range b.Entries() {
					i, j := model.PackedAt(b.Rows, k)
					x = append(x, live[i]*cmplx.Conj(live[j]))
				}
				continue
			}
			// Pairs of the sample in the order of its branches, the bus listed later first.
			for _, p := range [][2]int{{1, 0}, {2, 1}, {2, 0}} {
				x = append(x, live[p[0]]*cmplx.Conj(live[p[1]]))
			}
		case grid.ActivePower:
			for _, s := range power {
				x = append(x, complex(real(s), 0))
			}
		case grid.ReactivePower:
			for _, s := range power {
				x = append(x, complex(imag(s), 0))
			}
		case grid.SquaredPower:
			x = append(x, complex(real(power[0])*real(power[0]), 0))
		default:
			t.Fatalf("unknown block %q", b.Name)
		}
	}
	return x
}

// evaluate applies a constraint's map as the package comment of model defines it.
func evaluate(c *model.Constraint, x []complex128) []complex128 {
	out := make([]complex128, c.Map.Rows())
	for r := range out {
		out[r] = c.Map.ConstAt(r)
		for p := c.Map.Lin.Start[r]; p < c.Map.Lin.Start[r+1]; p++ {
			out[r] += c.Map.Lin.At(p) * x[c.Map.Lin.Col[p]]
		}
		if m := c.Map.Conj; m != nil {
			for p := m.Start[r]; p < m.Start[r+1]; p++ {
				out[r] += m.At(p) * cmplx.Conj(x[m.Col[p]])
			}
		}
		if c.RealRow(r) {
			out[r] = complex(real(out[r]), 0)
		}
	}
	return out
}
