package main

import (
	"compress/gzip"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"testing"

	"towpath/broker/wire"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// antenna is the array problem in its natural form: minimize t subject to |sum_x a[k][x] w[x]| <= t for every k and the
// complex equality sum_x e[x] w[x] = rhs.
type antenna struct {
	Side  [2]float64  `json:"rhs"`
	EqRe  []float64   `json:"e_re"`
	EqIm  []float64   `json:"e_im"`
	MapRe [][]float64 `json:"a_re"`
	MapIm [][]float64 `json:"a_im"`
}

// model writes the problem with two blocks, t real and w complex, and one lorentz cone of dimension 2 per k.
func (a *antenna) model() *model.Model {
	n := len(a.EqRe)
	m := &model.Model{Name: "antenna", Blocks: []model.Block{
		{Name: "t", Field: model.Real, Rows: 1, Cols: 1}, {Name: "w", Field: model.Complex, Rows: n, Cols: 1}}}
	m.Objective.Col, m.Objective.Coef = []uint32{0}, []complex128{1}
	weights := func(into *model.Matrix, re, im []float64) {
		for x := range n {
			into.Col, into.Z = append(into.Col, uint32(1+x)), append(into.Z, complex(re[x], im[x]))
		}
		into.Start = append(into.Start, len(into.Col))
	}
	look := model.Matrix{Start: []int{0}}
	weights(&look, a.EqRe, a.EqIm)
	m.Constraints = append(m.Constraints, model.Constraint{Name: "look direction", Cone: model.Cone{Kind: model.Zero},
		Map: model.Map{Field: model.Complex, Lin: look, Const: []complex128{complex(-a.Side[0], -a.Side[1])}}})
	for k := range a.MapRe {
		lobe := model.Matrix{Start: []int{0, 1}, Col: []uint32{0}, Z: []complex128{1}}
		weights(&lobe, a.MapRe[k], a.MapIm[k])
		m.Constraints = append(m.Constraints, model.Constraint{Cone: model.Cone{Kind: model.Lorentz}, Map: model.Map{Field: model.Complex, Lin: lobe}})
	}
	return m
}

// Problem nb of the 7th DIMACS Implementation Challenge (G. Pataki and S. Schmieta, The DIMACS library of semidefinite-quadratic-
// linear programs, 1999, from memory), natively and lowered. The printed value is that of minus t and differs from the
// optimum in the sixth digit.
func TestPublishedAntenna(t *testing.T) {
	if testing.Short() {
		t.Skip("takes long")
	}
	dir := os.Getenv("TOWPATH_CHECK_DATA")
	if dir == "" {
		t.Skip("TOWPATH_CHECK_DATA is not set: the published antenna problem is not tested")
	}
	f, err := os.Open(filepath.Join(dir, "antenna", "nb_complex.json.gz"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	z, err := gzip.NewReader(f)
	if err != nil {
		t.Fatal(err)
	}
	var a antenna
	if err := json.NewDecoder(z).Decode(&a); err != nil {
		t.Fatal(err)
	}
	m := a.model()
	b := embedded(t)
	var objectives []float64
	for _, sheet := range []string{"interior/complex", "interior/real"} {
		answer := programAnswer(t, b, proto.CloneOf(wire.ModelToProto(m)), sheet)
		verdict := verdictWord(answer.GetExamination().GetVerdict())
		t.Logf("%s: %s %.10g in %s, %d iterations, %s", sheet, outcomeWord(answer.GetOutcome()), answer.GetObjective(),
			durationText(answer.GetTimings().GetSolved()), answer.GetIterations(), verdict)
		if answer.GetOutcome() != towpathv1.Outcome_OUTCOME_OPTIMAL || verdict != "checked" {
			t.Errorf("%s: %s, %s: %v", sheet, outcomeWord(answer.GetOutcome()), verdict, answer.GetExamination().GetReasons())
		}
		const printed, digits = 0.0507030946, 1e-6
		if math.Abs(answer.GetObjective()-printed) > digits {
			t.Errorf("%s: %.10g, published %.10g", sheet, answer.GetObjective(), printed)
		}
		objectives = append(objectives, answer.GetObjective())
	}
	if math.Abs(objectives[0]-objectives[1]) > 1e-8 {
		t.Errorf("natively %.12g, lowered %.12g", objectives[0], objectives[1])
	}
}
