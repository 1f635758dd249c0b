package interior

import (
	"maps"
	"slices"
)

// item is one cone of the standard form with its data by reduced unknown: rows of A for a block, columns of F for a map.
type item struct {
	cone
	isBlock bool
	given   map[int]*sparse // while the form is built
	keys    []int           // reduced unknowns that meet the cone, rising
	data    []sparse        // of each key
	offset  []float64       // c_X of a block, f of a map
}

// sparse is a sparse vector.
type sparse struct {
	at []int
	v  []float64
}

func (s *sparse) put(at int, v float64) { s.at, s.v = append(s.at, at), append(s.v, v) }

// compact sorts and adds up what falls together.
func (s sparse) compact() sparse {
	order := make([]int, len(s.at))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return s.at[a] - s.at[b] })
	var out sparse
	for _, i := range order {
		if k := len(out.at) - 1; k >= 0 && out.at[k] == s.at[i] {
			out.v[k] += s.v[i]
		} else {
			out.put(s.at[i], s.v[i])
		}
	}
	return out
}

func (s *sparse) divide(x float64) {
	for i := range s.v {
		s.v[i] /= x
	}
}

func (s *sparse) dot(x []float64) float64 {
	var t float64
	for i, a := range s.at {
		t += s.v[i] * x[a]
	}
	return t
}

func (s *sparse) addTo(x []float64, f float64) {
	for i, a := range s.at {
		x[a] += f * s.v[i]
	}
}

func (it *item) put(key, at int, v float64) {
	if it.given[key] == nil {
		it.given[key] = &sparse{}
	}
	it.given[key].put(at, v)
}

// finish numbers free columns behind the rows.
func (it *item) finish(rows int) {
	place := func(k int) int {
		if k < 0 {
			return rows - 1 - k
		}
		return k
	}
	given := slices.SortedFunc(maps.Keys(it.given), func(a, b int) int { return place(a) - place(b) })
	for _, k := range given {
		it.keys, it.data = append(it.keys, place(k)), append(it.data, it.given[k].compact())
	}
	it.given = nil
}

// forward adds f D x for reduced unknowns x: A' y for a block, F u for a map.
func (it *item) forward(dst, x []float64, f float64) {
	for i, k := range it.keys {
		if x[k] != 0 {
			it.data[i].addTo(dst, f*x[k])
		}
	}
}

// back adds f D' v to the reduced unknowns.
func (it *item) back(dst, v []float64, f float64) {
	for i, k := range it.keys {
		dst[k] += f * it.data[i].dot(v)
	}
}
