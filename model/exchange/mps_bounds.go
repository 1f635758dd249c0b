package exchange

import (
	"fmt"
	"math"
	"strings"
)

// bound reads one bound: kind, set (which may be left out), column, value (which FR, MI and PL do not need).
func (p *mps) bound(words []string) error {
	kind := strings.ToUpper(words[0])
	valued := false
	switch kind {
	case "LO", "UP", "FX":
		valued = true
	case "FR", "MI", "PL":
	case "BV", "LI", "UI", "SC":
		return p.fault(fmt.Sprintf("bound %s makes a column integer or semicontinuous", kind), "no back end takes such columns; use LO and UP to solve the relaxation")
	default:
		return p.fault(fmt.Sprintf("bound kind %s is unknown", clip(words[0])), "use LO, UP, FX, FR, MI or PL")
	}
	set, name, value := p.boundWords(words[1:], valued)
	const form = "write the bound's kind, its set, the column and the value"
	k, ok := p.columnOf[name]
	switch {
	case name == "":
		return p.fault(fmt.Sprintf("a bound of %d words", len(words)), form)
	case !ok:
		return p.fault(fmt.Sprintf("column %s does not exist", clip(name)), form)
	}
	if err := p.set(boundSet, set); err != nil {
		return err
	}
	x := 0.0
	if valued {
		var err error
		if x, err = number(p.in.number, value); err != nil {
			return err
		}
		if math.Abs(x) >= 1e30 {
			x = math.Inf(int(math.Copysign(1, x)))
		}
	}
	return p.limit(&p.columns[k], kind, x)
}

// boundWords tells set, column and value apart. With one word missing it is the set, unless only that reading names a
// column.
func (p *mps) boundWords(words []string, valued bool) (set, column, value string) {
	for len(words) < 3 {
		words = append(words, "")
	}
	if valued && words[2] == "" {
		return "", words[0], words[1]
	}
	if _, ok := p.columnOf[words[1]]; !ok && !valued {
		return "", words[0], ""
	}
	return words[0], words[1], words[2]
}

func (p *mps) limit(c *mpsColumn, kind string, x float64) error {
	stated := func(line int) error {
		return p.fault(fmt.Sprintf("this bound on column %s was given in line %d", clip(c.name), line), "give each bound once")
	}
	at := p.in.number
	if kind != "UP" && kind != "PL" { // it states the lower bound
		if c.loLine > 0 {
			return stated(c.loLine)
		}
		c.loLine = at
	}
	if kind != "LO" && kind != "MI" {
		if c.upLine > 0 {
			return stated(c.upLine)
		}
		c.upLine = at
	}
	switch kind {
	case "LO":
		c.lower = x
	case "UP":
		c.upper = x
	case "FX":
		c.lower, c.upper = x, x
	case "FR":
		c.lower = math.Inf(-1)
	case "MI":
		c.lower = math.Inf(-1)
	}
	return nil
}
