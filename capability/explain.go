package capability

import (
	"fmt"
	"slices"
	"strings"
)

// deadEndsTold bounds how many dead ends behind the demands are explained.
const deadEndsTold = 12

// explain says for every kind among the demands that have no derivation what was tried, one line each, and then the same
// for the dead ends to which the bridges led, nearest first. Where several sizes of a kind fail, the first speaks for all.
func (d *deriver) explain(lost []Demand) []string {
	var lines []string
	var queue []int
	sizes := map[Kind]int{}
	for _, x := range lost {
		if sizes[x.Kind]++; sizes[x.Kind] == 1 {
			queue = append(queue, d.number[node{x.Kind, x.Size}])
		}
	}
	for k, demands := 0, len(queue); k < len(queue) && k < demands+deadEndsTold; k++ {
		kind := d.nodes[queue[k]].kind
		line, ends := d.tried(queue[k])
		if more := sizes[kind] - 1; k < demands && more > 0 {
			line += fmt.Sprintf("; other sizes that fail: %d", more)
		}
		lines = append(lines, line)
		for _, e := range ends {
			if at := d.nodes[e].kind; sizes[at] == 0 {
				sizes[at] = 1
				queue = append(queue, e)
			}
		}
	}
	if d.capped {
		lines = append(lines, "the search was cut short: there may be a way that it did not see")
	}
	return lines
}

// tried says why a sheet does not take a node and where each bridge that leaves it led. ends are the dead ends that have
// more to tell.
func (d *deriver) tried(at int) (line string, ends []int) {
	n := d.nodes[at]
	reason := "does not take it"
	if limit := d.sheet.Takes[n.kind]; limit > 0 {
		reason = fmt.Sprintf("takes it up to size %d", limit)
	}
	clauses := []string{fmt.Sprintf("%s: %s %s", n, d.sheet.Name, reason)}
	var elsewhere []string
	for _, r := range d.from[n.kind] {
		id := d.rules[r].ID()
		i := slices.IndexFunc(d.edges[at], func(e edge) bool { return e.rule == r })
		if i < 0 {
			elsewhere = append(elsewhere, id)
			continue
		}
		for _, p := range d.edges[at][i].parts {
			if len(d.front[p.at]) > 0 {
				continue
			}
			clauses = append(clauses, fmt.Sprintf("bridge %s leads to %s, a dead end", id, d.nodes[p.at]))
			ends = append(ends, p.at)
			break
		}
	}
	if len(elsewhere) > 0 && !d.capped {
		clauses = append(clauses, "at this size there is no use for "+strings.Join(elsewhere, ", "))
	}
	for _, b := range d.barred[n.kind] {
		clauses = append(clauses, fmt.Sprintf("bridge %s %s", b.rule.ID(), b.why))
	}
	if d.capped && len(d.from[n.kind]) > 0 && len(d.edges[at]) == 0 {
		clauses = append(clauses, "the search may have stopped here")
	}
	if len(clauses) == 1 {
		return clauses[0] + ", and no bridge leaves it", ends
	}
	return strings.Join(clauses, "; "), ends
}

// String names a node: the kind, and the size where the kind has sizes.
func (n node) String() string {
	if n.kind.Separable() {
		return n.kind.String()
	}
	return fmt.Sprintf("%s n=%d", n.kind, n.size)
}
