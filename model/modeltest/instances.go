package modeltest

import (
	"cmp"
	"compress/gzip"
	"embed"
	"encoding/json"
	"fmt"
	"io"
	"slices"
	"strings"

	"towpath/model"
)

//go:embed testdata
var files embed.FS

// Case is one instance with what is known of its answer. Multipliers follow package model's signs; matrices are packed.
type Case struct {
	ID           string
	Model        *model.Model
	Status       string  // optimal, infeasible, unbounded, weakly_infeasible, gap
	Value        float64 // of optimal ones
	Tolerance    float64 // on the value, absolute, relative above 1
	Pathological bool
	Source       string // citation; ends in "(from memory)" where it was not read
	Dual         map[string][]complex128
	Primal       map[string][]complex128
	Certificate  map[string][]complex128 // by constraint; known to be good or, for weakly infeasible ones, bad
}

// record is one entry of values.json.
type record struct {
	ID           string          `json:"id"`
	Status       string          `json:"status"`
	Value        json.RawMessage `json:"value"`
	Tolerance    float64         `json:"tolerance"`
	Pathological bool            `json:"pathological"`
	Citation     string          `json:"citation"`
	CitationRead bool            `json:"citation_read"`
	File         string          `json:"instance_file"`
	Dual         map[string]any  `json:"dual_expected"`
	Primal       map[string]any  `json:"primal_expected"`
	Certificate  map[string]any  `json:"certificate_numeric"`
}

// Cases loads all instances, sorted by id.
func Cases() ([]Case, error) {
	raw, err := files.ReadFile("testdata/values.json")
	if err != nil {
		return nil, err
	}
	var records []record
	if err := json.Unmarshal(raw, &records); err != nil {
		return nil, fmt.Errorf("values.json: %w", err)
	}
	var out []Case
	for _, r := range records {
		c, err := r.load()
		if err != nil {
			return nil, fmt.Errorf("instance %s: %w", r.ID, err)
		}
		out = append(out, c)
	}
	slices.SortFunc(out, func(a, b Case) int { return cmp.Compare(a.ID, b.ID) })
	return out, nil
}

func (r *record) load() (Case, error) {
	c := Case{ID: r.ID, Status: r.Status, Tolerance: r.Tolerance, Pathological: r.Pathological, Source: r.Citation}
	if !r.CitationRead {
		c.Source += " (from memory)"
	}
	if r.Status == "optimal" {
		if err := json.Unmarshal(r.Value, &c.Value); err != nil {
			return c, err
		}
	}
	m, err := readInstance(r.File)
	if err != nil {
		return c, err
	}
	c.Model = m
	fields := map[string]model.Field{}
	for k := range m.Constraints {
		fields[m.Constraints[k].Name] = m.Constraints[k].Map.Field
	}
	c.Dual, c.Certificate = numbers(r.Dual, fields), numbers(r.Certificate, fields)
	fields = map[string]model.Field{}
	for k := range m.Blocks {
		fields[m.Blocks[k].Name] = m.Blocks[k].Field
	}
	c.Primal = numbers(r.Primal, fields)
	return c, nil
}

func readInstance(name string) (*model.Model, error) {
	f, err := files.Open("testdata/" + strings.TrimPrefix(name, "instances/"))
	if err != nil {
		return nil, err
	}
	defer f.Close()
	var in io.Reader = f
	if strings.HasSuffix(name, ".gz") {
		if in, err = gzip.NewReader(f); err != nil {
			return nil, err
		}
	}
	return decodeInstance(in)
}

// numbers turns nested lists, or a pair of them under re and im, into packed or plain lists.
func numbers(in map[string]any, fields map[string]model.Field) map[string][]complex128 {
	if in == nil {
		return nil
	}
	out := map[string][]complex128{}
	for name, x := range in {
		re, im := x, any(nil)
		if parts, ok := x.(map[string]any); ok {
			re, im = parts["re"], parts["im"]
		}
		a, order := flat(re)
		v := make([]complex128, len(a))
		for i := range a {
			v[i] = complex(a[i], 0)
		}
		if b, _ := flat(im); len(b) == len(a) {
			for i := range b {
				v[i] += complex(0, b[i])
			}
		}
		if fields[name].IsMatrix() && order > 0 {
			full := v
			v = nil
			for j := range order {
				for i := j; i < order; i++ {
					v = append(v, full[i*order+j])
				}
			}
		}
		out[name] = v
	}
	return out
}

// flat lists numbers row by row; order is the number of rows of a matrix, 0 for others.
func flat(x any) (v []float64, order int) {
	switch x := x.(type) {
	case float64:
		return []float64{x}, 0
	case []any:
		for _, y := range x {
			w, _ := flat(y)
			if _, nested := y.([]any); nested {
				order = len(x)
			}
			v = append(v, w...)
		}
	}
	return v, order
}
