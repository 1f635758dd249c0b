package interior

import "math/bits"

// bitset is a set of small numbers.
type bitset []uint64

func newBitset(n int) bitset { return make(bitset, (n+63)/64) }

func (b bitset) add(i int)    { b[i/64] |= 1 << (i % 64) }
func (b bitset) remove(i int) { b[i/64] &^= 1 << (i % 64) }

func (b bitset) join(o bitset) {
	for k, w := range o {
		b[k] |= w
	}
}

func (b bitset) count() int {
	n := 0
	for _, w := range b {
		n += bits.OnesCount64(w)
	}
	return n
}

// list gives the elements, rising.
func (b bitset) list() []int32 {
	out := make([]int32, 0, b.count())
	for k, w := range b {
		for ; w != 0; w &= w - 1 {
			out = append(out, int32(64*k+bits.TrailingZeros64(w)))
		}
	}
	return out
}

// eliminate orders the vertices of a graph by minimum degree (W. Tinney and J. Walker 1967, from memory), the smaller number
// first among equals, and returns with the order what each vertex is adjacent to when its turn comes: the pattern of its
// column in the factor. The graph is used up. It gives up, with ok false, when the columns come to more than limit.
//
// Sets are words of bits, and joining two takes n/64 steps: for the few thousand unknowns of a dense engine's models that is
// quicker than the bookkeeping of quotient graphs.
func eliminate(graph []bitset, limit int) (order []int32, columns [][]int32, ok bool) {
	n := len(graph)
	degree := make([]int, n)
	for i, g := range graph {
		g.remove(i)
		degree[i] = g.count()
	}
	gone := make([]bool, n)
	total := 0
	for range n {
		best := -1
		for i, d := range degree {
			if !gone[i] && (best < 0 || d < degree[best]) {
				best = i
			}
		}
		column := graph[best].list()
		if total += len(column); total > limit {
			return nil, nil, false
		}
		gone[best] = true
		for _, v := range column {
			g := graph[v]
			g.join(graph[best])
			g.remove(int(v))
			g.remove(best)
			degree[v] = g.count()
		}
		graph[best] = nil
		order, columns = append(order, int32(best)), append(columns, column)
	}
	return order, columns, true
}
