package exchange

import (
	"fmt"
	"math"
	"strings"
)

func (p *mps) row(words []string) error {
	if len(words) != 2 {
		return p.fault(fmt.Sprintf("a row of %d words", len(words)), "write its kind and its name, which has no blanks")
	}
	kind, name := strings.ToUpper(words[0]), words[1]
	if len(kind) != 1 || !strings.Contains("NELG", kind) {
		return p.fault(fmt.Sprintf("row kind %s is unknown", clip(words[0])), "use N, E, L or G")
	}
	if _, ok := p.rowOf[name]; ok {
		return p.fault(fmt.Sprintf("row %s is declared twice", clip(name)), "give every row its own name")
	}
	if kind == "N" && p.objective < 0 {
		p.objective = len(p.rows)
	}
	p.rowOf[name] = len(p.rows)
	p.rows = append(p.rows, mpsRow{name: name, kind: kind[0]})
	return nil
}

func (p *mps) column(words []string) error {
	if len(words) >= 2 && words[1] == "'MARKER'" {
		return p.fault("integer columns begin here", "no back end takes integer columns; take the MARKER lines away to solve the relaxation")
	}
	if len(words) != 3 && len(words) != 5 {
		return p.fault(fmt.Sprintf("a column line of %d words", len(words)), "write the column and one or two pairs of row and value; names have no blanks")
	}
	name := words[0]
	k, ok := p.columnOf[name]
	last := len(p.columns) - 1
	switch {
	case !ok:
		if last >= 0 {
			p.columns[last].rows = nil
		}
		k = len(p.columns)
		p.columnOf[name] = k
		p.columns = append(p.columns, mpsColumn{name: name, upper: math.Inf(1), rows: map[int]int{}})
	case k != last:
		return p.fault(fmt.Sprintf("column %s goes on after other columns", clip(name)), "write all entries of a column together")
	}
	return p.pairs(words[1:], func(r int, x float64) error {
		if before, ok := p.columns[k].rows[r]; ok {
			return p.fault(fmt.Sprintf("the entry of column %s in row %s was given in line %d", clip(name), clip(p.rows[r].name), before), "give each entry once")
		}
		p.columns[k].rows[r] = p.in.number
		if x != 0 {
			p.rows[r].entries = append(p.rows[r].entries, mpsEntry{k, x})
		}
		return nil
	})
}

// pairs reads row names and values.
func (p *mps) pairs(words []string, take func(row int, x float64) error) error {
	for ; len(words) > 0; words = words[2:] {
		r, ok := p.rowOf[words[0]]
		if !ok {
			return p.fault(fmt.Sprintf("row %s does not exist", clip(words[0])), "declare it in ROWS or correct its name")
		}
		x, err := number(p.in.number, words[1])
		if err != nil {
			return err
		}
		if err := take(r, x); err != nil {
			return err
		}
	}
	return nil
}

// set holds a line to the one set of its section. Lines may leave the set's name out.
func (p *mps) set(section int, name string) error {
	if p.hasSet[section] && p.sets[section] != name {
		what := [...]string{"right-hand sides", "ranges", "bounds"}[section]
		return p.fault(fmt.Sprintf("a second set of %s, %s", what, clip(name)), "keep one set in the file")
	}
	p.sets[section], p.hasSet[section] = name, true
	return nil
}

// named splits the set's name off a line of pairs.
func (p *mps) named(section int, words []string) ([]string, error) {
	name := ""
	if len(words)%2 == 1 {
		name, words = words[0], words[1:]
	}
	if n := len(words); n != 2 && n != 4 {
		return nil, p.fault(fmt.Sprintf("a line of %d words", n), "write the set's name and one or two pairs of row and value")
	}
	return words, p.set(section, name)
}

func (p *mps) rhs(words []string) error {
	words, err := p.named(rhsSet, words)
	if err != nil {
		return err
	}
	return p.pairs(words, func(r int, x float64) error {
		row := &p.rows[r]
		if row.rhsLine > 0 {
			return p.fault(fmt.Sprintf("row %s had its right-hand side in line %d", clip(row.name), row.rhsLine), "give each row one")
		}
		row.rhs, row.rhsLine = x, p.in.number
		return nil
	})
}

func (p *mps) ranges(words []string) error {
	words, err := p.named(rangeSet, words)
	if err != nil {
		return err
	}
	return p.pairs(words, func(r int, x float64) error {
		row := &p.rows[r]
		switch {
		case row.kind == 'N':
			return p.fault(fmt.Sprintf("row %s is free and cannot have a range", clip(row.name)), "make it an E, L or G row")
		case row.rangeSet > 0:
			return p.fault(fmt.Sprintf("row %s had its range in line %d", clip(row.name), row.rangeSet), "give each row one")
		}
		row.spread, row.rangeSet = x, p.in.number
		return nil
	})
}
