package capability_test

import (
	"fmt"
	"os"
	"strconv"
	"strings"

	. "towpath/capability"
	"towpath/model"
)

// planFile is a planning task written as text, one statement a line:
//
//	rule ID FROM [n=K | n<=K | n>=K] -> KIND SIZE [xCOUNT] + ... [inner | outer] [last-resort] [values-only]
//	sheet NAME takes KIND[:LARGEST] ... [needs KIND ...] [returns WORD ...] [toll flat | toll sum | toll interior]
//	demand KIND SIZE xCOUNT
//	sheets NAME ...                 keep only these of the sheets read so far
//	allow inner | outer;  need WORD ...;  memory BYTES;  disable ID ...;  visits N
//
// Sizes and counts are numbers or one of n, 2n, 2n-1, n+1, n-1, n(n-1)/2, n(n+1)/2, 0.
type planFile struct {
	rules   []*testRule
	sheets  []*Sheet
	demands []Demand
	options Options
}

func (p *planFile) plan() []Proposal {
	var rules []Rule
	for _, r := range p.rules {
		rules = append(rules, r)
	}
	return Plan(p.demands, rules, p.sheets, p.options)
}

// readPlanFile adds the statements of a file.
func readPlanFile(path string) (*planFile, error) {
	text, err := os.ReadFile(path)
	if err != nil {
		return nil, err
	}
	p := &planFile{}
	return p, p.read(string(text))
}

func (p *planFile) read(text string) error {
	for k, line := range strings.Split(text, "\n") {
		words := strings.Fields(line)
		if len(words) == 0 || strings.HasPrefix(line, "#") {
			continue
		}
		if err := p.statement(words[0], words[1:]); err != nil {
			return fmt.Errorf("line %d: %w", k+1, err)
		}
	}
	return nil
}

func (p *planFile) statement(verb string, words []string) (err error) {
	switch verb {
	case "catalogue":
		text, err := os.ReadFile("testdata/catalogue.txt")
		if err != nil {
			return err
		}
		return p.read(string(text))
	case "rule":
		r, err := readRule(words)
		p.rules = append(p.rules, r)
		return err
	case "sheet":
		s, err := readSheet(words)
		p.sheets = append(p.sheets, s)
		return err
	case "sheets":
		var kept []*Sheet
		for _, s := range p.sheets {
			if strings.Contains(" "+strings.Join(words, " ")+" ", " "+s.Name+" ") {
				kept = append(kept, s)
			}
		}
		p.sheets = kept
	case "demand":
		d := Demand{}
		if d.Kind, err = readKind(words[0]); err != nil {
			return err
		}
		if d.Size, err = strconv.Atoi(words[1]); err != nil {
			return err
		}
		d.Count, err = strconv.Atoi(strings.TrimPrefix(words[2], "x"))
		p.demands = append(p.demands, d)
	case "allow":
		for _, w := range words {
			p.options.Allow = append(p.options.Allow, map[string]Exactness{"inner": Inner, "outer": Outer}[w])
		}
	case "need":
		p.options.Need = readLifts(words)
	case "memory":
		p.options.MaxBytes, err = strconv.ParseFloat(words[0], 64)
	case "disable":
		p.options.Disabled = words
	case "visits":
		p.options.MaxVisits, err = strconv.Atoi(words[0])
	default:
		err = fmt.Errorf("no statement %q", verb)
	}
	return err
}

func readRule(words []string) (r *testRule, err error) {
	r = &testRule{id: words[0], lifts: LiftsAll}
	if r.from, err = readKind(words[1]); err != nil {
		return nil, err
	}
	for _, w := range words[2:] {
		switch {
		case w == "->" || w == "+":
		case strings.HasPrefix(w, "n>="):
			r.least, err = strconv.Atoi(w[3:])
		case strings.HasPrefix(w, "n<="):
			r.largest, err = strconv.Atoi(w[3:])
		case strings.HasPrefix(w, "n="):
			r.least, err = strconv.Atoi(w[2:])
			r.largest = r.least
		case strings.Contains(w, "/") && !strings.Contains(w, "("):
			p := testPart{count: number(1)}
			p.kind, err = readKind(w)
			r.parts = append(r.parts, p)
		case w == "inner":
			r.exactness = Inner
		case w == "outer":
			r.exactness = Outer
		case w == "last-resort":
			r.lastResort = true
		case w == "values-only":
			r.lifts = LiftsValues
		case strings.HasPrefix(w, "x"):
			r.parts[len(r.parts)-1].count, err = readFormula(w[1:])
		default:
			r.parts[len(r.parts)-1].size, err = readFormula(w)
		}
		if err != nil {
			return nil, fmt.Errorf("rule %s: %w", r.id, err)
		}
	}
	return r, nil
}

func readFormula(w string) (formula, error) {
	switch w {
	case "n":
		return formula{0, 1, 0, 1}, nil
	case "2n":
		return formula{0, 2, 0, 1}, nil
	case "2n-1":
		return formula{0, 2, -1, 1}, nil
	case "n+1":
		return formula{0, 1, 1, 1}, nil
	case "n-1":
		return formula{0, 1, -1, 1}, nil
	case "n(n-1)/2":
		return formula{1, -1, 0, 2}, nil
	case "n(n+1)/2":
		return formula{1, 1, 0, 2}, nil
	}
	k, err := strconv.Atoi(w)
	return number(k), err
}

// testRates are round numbers: a second for 1e9 flops.
var testRates = Rates{Start: 1e-3, Iterations: 10, Flops: 1e9, Matrix: 80, Scalar: 100, Product: 4, Entry: 4, Pair: 30, Bytes: 1e5, Copies: 2, Matrices: 12}

// testTolls: interior is an interior-point method with round rates, flat is the same for every load, sum a second per item and
// size.
var testTolls = map[string]func(Load) Toll{
	"interior": func(l Load) Toll { return InteriorToll(l, testRates) },
	"flat":     func(Load) Toll { return Toll{Seconds: 1, Bytes: 1e3} },
	"sum": func(l Load) (t Toll) {
		for _, d := range l {
			t.Seconds += float64(d.Size * d.Count)
			t.Bytes += 1e3 * float64(d.Size*d.Count)
		}
		return t
	},
}

func readSheet(words []string) (*Sheet, error) {
	s := &Sheet{Name: words[0], Backend: strings.Split(words[0], "/")[0], Takes: map[Kind]int{}, Returns: LiftsAll, Toll: testTolls["interior"], Mounts: true}
	at := ""
	for _, w := range words[1:] {
		switch w {
		case "takes", "needs", "toll":
			at = w
			continue
		case "returns":
			at, s.Returns = w, 0
			continue
		}
		switch at {
		case "toll":
			s.Toll, s.Mounts = testTolls[w], w != "flat"
		case "returns":
			s.Returns |= readLifts([]string{w})
		default:
			name, limit, limited := strings.Cut(w, ":")
			k, err := readKind(name)
			if err != nil {
				return nil, fmt.Errorf("sheet %s: %w", s.Name, err)
			}
			if at == "needs" {
				s.Needs = append(s.Needs, k)
				continue
			}
			s.Takes[k] = 0
			if limited {
				if s.Takes[k], err = strconv.Atoi(limit); err != nil {
					return nil, err
				}
			}
		}
	}
	return s, nil
}

func readLifts(words []string) (l Lifts) {
	for _, w := range words {
		l |= map[string]Lifts{"values": LiftsValues, "multipliers": LiftsMultipliers, "infeasibility": LiftsInfeasibility, "unboundedness": LiftsUnboundedness}[w]
	}
	return l
}

// readKind reads a kind's name.
func readKind(name string) (Kind, error) {
	for p := OnBlock; p <= OnBounds; p++ {
		for f := model.Real; f <= model.Hermitian; f++ {
			for c := model.Free; c <= model.Box; c++ {
				if k := (Kind{p, f, c}); k.String() == name {
					return k, nil
				}
			}
		}
	}
	return Kind{}, fmt.Errorf("no kind %q", name)
}
