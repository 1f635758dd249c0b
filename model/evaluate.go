package model

// ObjectiveAt returns Re(c^T x) + constant at a point, in the model's own sense. The point has the model's shape.
func (m *Model) ObjectiveAt(x *Point) float64 {
	starts := m.Starts()
	v := m.Objective.Const
	for k, col := range m.Objective.Col {
		v += real(m.Objective.Coef[k] * m.entryAt(x, starts, col))
	}
	return v
}

// RowsAt returns the rows F_k(x) of constraint k at a point: one number per row, real where the row is real.
func (m *Model) RowsAt(k int, x *Point) []complex128 {
	c := &m.Constraints[k]
	f := &c.Map
	starts := m.Starts()
	rows := make([]complex128, f.Rows())
	for r := range rows {
		v := f.ConstAt(r)
		for p := f.Lin.Start[r]; p < f.Lin.Start[r+1]; p++ {
			v += f.Lin.At(p) * m.entryAt(x, starts, f.Lin.Col[p])
		}
		if f.Conj != nil {
			for p := f.Conj.Start[r]; p < f.Conj.Start[r+1]; p++ {
				v += f.Conj.At(p) * conjugate(m.entryAt(x, starts, f.Conj.Col[p]))
			}
		}
		if c.RealRow(r) {
			v = complex(real(v), 0)
		}
		rows[r] = v
	}
	return rows
}

// AdjointAt returns F_k^* y for a multiplier y of constraint k: a number for every entry, such that under the inner
// products of the package comment <y, F_k(x) - F_k(0)> = <F_k^* y, x> for every x. Sums over several constraints and
// bounds are the left side of stationarity.
func (m *Model) AdjointAt(k int, y []complex128) *Point {
	c := &m.Constraints[k]
	f := &c.Map
	starts := m.Starts()
	sums := make([]complex128, starts[len(m.Blocks)])
	for r := range f.Rows() {
		v := y[r] * complex(c.Weight(r), 0)
		if c.RealRow(r) {
			v = complex(real(v), 0)
		}
		// <v, a x> = <conj(a) v, x> and <v, a conj(x)> = <a conj(v), x>.
		for p := f.Lin.Start[r]; p < f.Lin.Start[r+1]; p++ {
			sums[f.Lin.Col[p]] += conjugate(f.Lin.At(p)) * v
		}
		if f.Conj != nil {
			for p := f.Conj.Start[r]; p < f.Conj.Start[r+1]; p++ {
				sums[f.Conj.Col[p]] += f.Conj.At(p) * conjugate(v)
			}
		}
	}
	out := &Point{}
	for b := range m.Blocks {
		v := sums[starts[b]:starts[b+1]:starts[b+1]]
		m.Blocks[b].intoProduct(v)
		out.Values = append(out.Values, v)
	}
	return out
}

// Gradient returns c, the gradient of the objective in its own sense: <c, x> = f(x) - f(0) for every x.
func (m *Model) Gradient() *Point {
	out := &Point{}
	for b := range m.Blocks {
		out.Values = append(out.Values, make([]complex128, m.Blocks[b].Entries()))
	}
	starts, b := m.Starts(), 0
	for k, col := range m.Objective.Col {
		for int(col) >= starts[b+1] {
			b++
		}
		out.Values[b][int(col)-starts[b]] = conjugate(m.Objective.Coef[k])
	}
	for b := range m.Blocks {
		m.Blocks[b].intoProduct(out.Values[b])
	}
	return out
}

// intoProduct turns derivatives by entries into an element of the block's inner product space: entries that count twice
// are halved, and real entries lose their imaginary part.
func (b *Block) intoProduct(v []complex128) {
	for k := range v {
		v[k] /= complex(b.Weight(k), 0)
		if b.RealEntry(k) {
			v[k] = complex(real(v[k]), 0)
		}
	}
}

// entryAt is the value of the entry with the given column.
func (m *Model) entryAt(x *Point, starts []int, col uint32) complex128 {
	b := blockOf(starts, col)
	return x.Values[b][int(col)-starts[b]]
}

func conjugate(z complex128) complex128 { return complex(real(z), -imag(z)) }
