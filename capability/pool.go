package capability

// pool hands out memory for derivations in large pieces: a plan makes many small ones, and forgets them together.
type pool struct {
	cells []derivation
	ways  []*derivation
	items []part

	next  derivation // scratch
	parts []*derivation
}

// piece is how much a pool asks for at a time.
const piece = 256

// copy makes a lasting copy of a derivation.
func (p *pool) copy(w *derivation) *derivation {
	if len(p.cells) == 0 {
		p.cells = make([]derivation, piece)
	}
	c := &p.cells[0]
	p.cells = p.cells[1:]
	*c = *w
	c.parts, p.ways = take(p.ways, w.parts)
	c.load, p.items = take(p.items, w.load)
	return c
}

// take copies a slice into the front of free, which it renews when it is used up, and returns the copy and what is left.
func take[T any](free, of []T) (taken, left []T) {
	n := len(of)
	if n > len(free) {
		free = make([]T, max(n, piece))
	}
	copy(free, of)
	return free[:n:n], free[n:]
}
