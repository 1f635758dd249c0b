package wire

import (
	"testing"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// million is a model of a million complex coefficients in one constraint, as arrays or as terms.
func million(terms bool) *towpathv1.Model {
	const rows, each = 10_000, 100
	m := &model.Matrix{Start: []int{0}}
	c := &towpathv1.Constraint{Field: towpathv1.Field_FIELD_COMPLEX, Rows: rows, Cone: towpathv1.Cone_CONE_ZERO}
	for r := range rows {
		for k := range each {
			m.Col, m.Z = append(m.Col, uint32(k)), append(m.Z, complex(float64(r), 1))
			if terms {
				c.Terms = append(c.Terms, &towpathv1.Term{Row: []uint64{uint64(r)}, Of: &towpathv1.Term_BlockNumber{}, Entry: []uint64{uint64(k)}, Re: float64(r), Im: 1})
			}
		}
		m.Start = append(m.Start, len(m.Col))
	}
	if !terms {
		c.Coefficients = matrixToProto(m)
	}
	return &towpathv1.Model{Blocks: []*towpathv1.Block{{Field: towpathv1.Field_FIELD_COMPLEX, Rows: each}}, Constraints: []*towpathv1.Constraint{c}}
}

func benchmarkDecode(b *testing.B, terms bool) {
	raw, err := proto.Marshal(million(terms))
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(raw)))
	b.ReportAllocs()
	for b.Loop() {
		p := &towpathv1.Model{}
		if err := proto.Unmarshal(raw, p); err != nil {
			b.Fatal(err)
		}
		m, err := ModelFromProto(p)
		if err != nil {
			b.Fatal(err)
		}
		if err := m.Validate(); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkDecodeArrays(b *testing.B) { benchmarkDecode(b, false) }
func BenchmarkDecodeTerms(b *testing.B)  { benchmarkDecode(b, true) }

func BenchmarkModelID(b *testing.B) {
	m, err := ModelFromProto(million(false))
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(20_000_000)
	for b.Loop() {
		ModelID(m)
	}
}
