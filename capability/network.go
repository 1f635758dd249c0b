package capability

import (
	"cmp"
	"slices"
)

// node is a kind at a size.
type node struct {
	kind Kind
	size int
}

// compareNodes sorts by kind, then the largest size first: along a load sorted like this, dominance is read off by
// adding up from the left.
func compareNodes(a, b node) int {
	return cmp.Or(compareKinds(a.kind, b.kind), cmp.Compare(b.size, a.size))
}

func compareKinds(a, b Kind) int {
	return cmp.Or(cmp.Compare(a.Place, b.Place), cmp.Compare(a.Field, b.Field), cmp.Compare(a.Cone, b.Cone))
}

// edge is a usable rule at one node, with what it yields there.
type edge struct {
	rule  int // in network.rules
	parts []part
}

// part is a number of items at a node.
type part struct {
	at    int // in network.nodes
	count int
}

// barred is a rule that the options rule out.
type barred struct {
	rule Rule
	why  string
}

// network holds every node that a plan can come to, with the crossings between them. It does not depend on a sheet: all
// sheets of a plan share one.
type network struct {
	rules  []Rule // usable ones, sorted by id
	last   []bool // rules[i].LastResort()
	from   map[Kind][]int
	barred map[Kind][]barred // sorted by id

	nodes   []node // sorted once explored
	kinds   []int  // the nodes' kinds, numbered in order
	edges   [][]edge
	rising  []int   // nodes in the order of a Load: those of a kind by rising size
	parents [][]int // nodes with a crossing to this one, each once
	order   []int   // nodes, those found last first: parts mostly before what they are parts of

	number map[node]int
	state  []expansion
	round  int
	queue  []int // scratch
	budget int   // visits left
	capped bool  // the budget ran out: nodes may be missing
}

// expansion says how far exploration has come at a node.
type expansion struct {
	expanded bool // its crossings are known
	closed   bool // and those of everything behind it
	round    int  // of spreading that came here last
	lows     [][]node
}

// explore builds the network of everything that the roots can become.
func explore(roots []node, rules []Rule, barredRules []barred, budget int) *network {
	w := &network{rules: rules, from: map[Kind][]int{}, barred: map[Kind][]barred{}, number: map[node]int{}, budget: budget}
	for i, r := range rules {
		w.last = append(w.last, r.LastResort())
		w.from[r.From()] = append(w.from[r.From()], i)
	}
	for _, b := range barredRules {
		w.barred[b.rule.From()] = append(w.barred[b.rule.From()], b)
	}
	for _, r := range roots {
		if !w.spread(w.at(r)) {
			w.creep(w.at(r))
		}
	}
	w.settle()
	return w
}

// at numbers a node.
func (w *network) at(n node) int {
	i, ok := w.number[n]
	if !ok {
		i = len(w.nodes)
		w.number[n] = i
		w.nodes = append(w.nodes, n)
		w.edges = append(w.edges, nil)
		w.state = append(w.state, expansion{})
	}
	return i
}

// expand works out the crossings that leave a node. Rules that yield what cannot be (sizes or counts below one) are
// taken not to apply.
func (w *network) expand(i int) {
	if w.state[i].expanded {
		return
	}
	w.state[i].expanded = true
	n := w.nodes[i]
	for _, r := range w.from[n.kind] {
		yields, ok := w.rules[r].Yields(n.size)
		if !ok || slices.ContainsFunc(yields, func(d Demand) bool { return d.Size < 1 || d.Count < 1 }) {
			continue
		}
		e := edge{rule: r, parts: make([]part, 0, len(yields))}
		for _, d := range yields {
			e.parts = append(e.parts, part{w.at(node{d.Kind, d.Size}), min(d.Count, most)})
		}
		w.edges[i] = append(w.edges[i], e)
	}
}

// spread expands everything behind a root. It gives up, returning false, when some kind turns up at two sizes: only then
// can sizes grow for ever.
func (w *network) spread(root int) bool {
	if w.state[root].closed {
		return true
	}
	w.round++
	queue := append(w.queue[:0], root)
	defer func() { w.queue = queue }()
	w.state[root].round = w.round
	for k := 0; k < len(queue); k++ {
		i := queue[k]
		for _, earlier := range queue[:k] {
			if w.nodes[earlier].kind == w.nodes[i].kind {
				return false
			}
		}
		if w.budget--; w.budget < 0 {
			w.capped = true
			return true
		}
		w.expand(i)
		for _, e := range w.edges[i] {
			for _, p := range e.parts {
				if s := &w.state[p.at]; s.round != w.round && !s.closed {
					s.round = w.round
					queue = append(queue, p.at)
				}
			}
		}
	}
	for _, i := range queue {
		w.state[i].closed = true
	}
	return true
}

// creep expands behind a root along paths on which no kind comes back larger than it was.
//
// Nothing is lost by that. Rules are monotone: what applies to an item applies to a smaller one of the kind, or something
// no worse does, and yields no more there. So whatever a kind can become when it comes back larger, the smaller item
// earlier on the same path could have become with no more; that derivation dominates, and it is shorter. A kind that comes
// back at the same size is no different, but needs no care here: the node is in the network already. Along a path the
// sizes of a kind therefore fall, so paths end, and the network is finite although the rules may make Hermitian matrices
// of order n into symmetric ones of order 2n and those into Hermitian ones of order 2n for ever.
//
// Which kinds may follow depends on the path. A node is visited again only on a path that allows something that no
// earlier one allowed: one that is not at least as tight, kind by kind, as an earlier one.
func (w *network) creep(root int) {
	type visit struct {
		at   int
		lows []node // smallest size of every kind on the path, sorted
	}
	for i := range w.state {
		w.state[i].lows = nil
	}
	queue := []visit{{at: root}}
	for k := 0; k < len(queue); k++ {
		v := queue[k]
		queue[k].lows = nil
		n := w.nodes[v.at]
		spot, found := slices.BinarySearchFunc(v.lows, n, func(a, b node) int { return compareKinds(a.kind, b.kind) })
		if found && v.lows[spot].size < n.size {
			continue
		}
		if slices.ContainsFunc(w.state[v.at].lows, func(earlier []node) bool { return tighter(v.lows, earlier) }) {
			continue
		}
		if w.budget--; w.budget < 0 {
			w.capped = true
			return
		}
		w.state[v.at].lows = append(w.state[v.at].lows, v.lows)
		w.expand(v.at)
		lows := slices.Clone(v.lows)
		if found {
			lows[spot] = n
		} else {
			lows = slices.Insert(lows, spot, n)
		}
		for _, e := range w.edges[v.at] {
			for _, p := range e.parts {
				queue = append(queue, visit{p.at, lows})
			}
		}
	}
}

// tighter reports whether a path with the smallest sizes a allows nothing that one with b does not allow.
func tighter(a, b []node) bool {
	for _, n := range b {
		k, ok := slices.BinarySearchFunc(a, n, func(x, y node) int { return compareKinds(x.kind, y.kind) })
		if !ok || a[k].size > n.size {
			return false
		}
	}
	return true
}

// settle sorts the nodes and links them backwards. The result does not depend on the order of discovery, apart from
// order, which affects time only.
func (w *network) settle() {
	byRank := make([]int, len(w.nodes))
	for i := range byRank {
		byRank[i] = i
	}
	slices.SortFunc(byRank, func(a, b int) int { return compareNodes(w.nodes[a], w.nodes[b]) })
	rank := make([]int, len(byRank))
	nodes, edges := make([]node, len(byRank)), make([][]edge, len(byRank))
	for r, i := range byRank {
		rank[i], nodes[r], edges[r] = r, w.nodes[i], w.edges[i]
		w.number[w.nodes[i]] = r
	}
	w.nodes, w.edges, w.state = nodes, edges, nil
	w.kinds = make([]int, len(nodes))
	for i := 1; i < len(nodes); i++ {
		w.kinds[i] = w.kinds[i-1]
		if nodes[i].kind != nodes[i-1].kind {
			w.kinds[i]++
		}
	}
	w.rising = make([]int, len(nodes))
	for from := 0; from < len(nodes); {
		to := from
		for to < len(nodes) && w.kinds[to] == w.kinds[from] {
			to++
		}
		for i := from; i < to; i++ {
			w.rising[i] = from + to - 1 - i
		}
		from = to
	}
	w.parents = make([][]int, len(nodes))
	for i := range w.edges {
		for _, e := range w.edges[i] {
			for k := range e.parts {
				at := rank[e.parts[k].at]
				e.parts[k].at = at
				if above := w.parents[at]; len(above) == 0 || above[len(above)-1] != i {
					w.parents[at] = append(above, i)
				}
			}
		}
	}
	for k := len(rank) - 1; k >= 0; k-- {
		w.order = append(w.order, rank[k])
	}
}
