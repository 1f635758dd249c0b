package bridges

import "towpath/model"

// finish compacts the draft into a model that minimizes: columns of lowered blocks are replaced by what they stand for,
// in one pass over the coefficients.
func (d *draft) finish(name string) *model.Model {
	out := &model.Model{Name: name}
	final := make([]int, len(d.owner)) // column in the finished model, -1 for those of lowered blocks
	next := 0
	for i := range d.blocks {
		b := &d.blocks[i]
		for k := range b.block.Entries() {
			final[b.start+k] = -1
			if !b.gone {
				final[b.start+k] = next
				next++
			}
		}
		if !b.gone {
			b.final = len(out.Blocks)
			block := b.block
			block.Bounds = b.bounds
			out.Blocks = append(out.Blocks, block)
		}
	}
	s := &substitution{d: d, final: final, w: newWriter(newDraft(out), 0)}
	for i := range d.maps {
		if m := &d.maps[i]; !m.gone {
			m.final = len(out.Constraints)
			out.Constraints = append(out.Constraints, s.constraint(m.c))
		}
	}
	out.Objective = s.objective(d.obj)
	return out
}

// substitution rewrites the draft's columns as finished ones.
type substitution struct {
	d     *draft
	final []int
	w     *writer // over the finished model's columns
}

// expand adds a x + b conj(x) for the draft's column x.
func (s *substitution) expand(col int, a, b complex128) {
	if s.final[col] >= 0 {
		s.w.add(uint32(s.final[col]), a, b)
		return
	}
	blk := &s.d.blocks[s.d.owner[col]]
	realEntry := blk.block.RealEntry(col - blk.start)
	blk.values.each(col-blk.start, func(j int, p, q complex128) {
		if realEntry { // the entry is the real part of its combination
			p, q = (p+conj(q))/2, (q+conj(p))/2
		}
		s.expand(blk.next+j, a*p+b*conj(q), a*q+b*conj(p))
	})
}

func (s *substitution) constraint(c model.Constraint) model.Constraint {
	m := &c.Map
	if s.untouched(&m.Lin) && (m.Conj == nil || s.untouched(m.Conj)) {
		m.Lin = s.renumber(m.Lin)
		if m.Conj != nil {
			k := s.renumber(*m.Conj)
			m.Conj = &k
		}
		return c
	}
	s.w.reset(m.Rows(), m.Nonzeros())
	for r := range m.Rows() {
		for p := m.Lin.Start[r]; p < m.Lin.Start[r+1]; p++ {
			s.expand(int(m.Lin.Col[p]), m.Lin.At(p), 0)
		}
		if m.Conj != nil {
			for p := m.Conj.Start[r]; p < m.Conj.Start[r+1]; p++ {
				s.expand(int(m.Conj.Col[p]), 0, m.Conj.At(p))
			}
		}
		s.w.endRow(c.RealRow(r))
	}
	m.Lin, m.Conj = s.w.matrices()
	return c
}

func (s *substitution) objective(o model.Objective) model.Objective {
	sign := 1.0
	if o.Sense == model.Maximize {
		sign = -1
	}
	s.w.reset(1, len(o.Col))
	for k, col := range o.Col {
		s.expand(int(col), complex(sign, 0)*o.Coef[k], 0)
	}
	s.w.endRow(true)
	lin, _ := s.w.matrices()
	out := model.Objective{Col: lin.Col, Const: sign * o.Const}
	for p := range lin.Col {
		out.Coef = append(out.Coef, lin.At(p))
	}
	return out
}

func (s *substitution) untouched(m *model.Matrix) bool {
	for _, c := range m.Col {
		if s.final[c] < 0 {
			return false
		}
	}
	return true
}

// renumber keeps rows sorted, because finished columns keep the draft's order. Matrices that keep all their columns are
// shared.
func (s *substitution) renumber(m model.Matrix) model.Matrix {
	for i, c := range m.Col {
		if s.final[c] != int(c) {
			cols := make([]uint32, len(m.Col))
			copy(cols, m.Col[:i])
			for k := i; k < len(cols); k++ {
				cols[k] = uint32(s.final[m.Col[k]])
			}
			m.Col = cols
			break
		}
	}
	return m
}
