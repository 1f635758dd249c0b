package main

import (
	"bytes"
	"io"
	"strings"
	"testing"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// streamOf sends an answer as a broker does and returns its messages.
func streamOf(t *testing.T, a *towpathv1.Answer) []*towpathv1.FetchAnswerResponse {
	t.Helper()
	head := proto.Clone(a).(*towpathv1.Answer)
	parcels := unload(head)
	messages := []*towpathv1.FetchAnswerResponse{{Part: &towpathv1.FetchAnswerResponse_Head{Head: head}}}
	for _, p := range parcels {
		err := p.sendChunks(func(c *towpathv1.Chunk) error {
			messages = append(messages, &towpathv1.FetchAnswerResponse{Part: &towpathv1.FetchAnswerResponse_Chunk{Chunk: c}})
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	return messages
}

func receive(messages []*towpathv1.FetchAnswerResponse) (*towpathv1.Answer, error) {
	return receiveAnswer(func() (*towpathv1.FetchAnswerResponse, error) {
		if len(messages) == 0 {
			return nil, io.EOF
		}
		m := messages[0]
		messages = messages[1:]
		return m, nil
	})
}

// wide is an answer with arrays of every size class: in the head, in one chunk, in several.
func wide() *towpathv1.Answer {
	values := func(n int) *towpathv1.Numbers {
		data := make([]byte, 8*n)
		for k := range data {
			data[k] = byte(k * 7)
		}
		return &towpathv1.Numbers{F64: &towpathv1.Array{Place: &towpathv1.Array_Data{Data: data}}}
	}
	return &towpathv1.Answer{
		Outcome: towpathv1.Outcome_OUTCOME_OPTIMAL,
		Values: []*towpathv1.BlockValues{
			{Name: "small", Entries: values(3)}, {Name: "middle", Entries: values(600)}, {Name: "large", Entries: values(300_000)},
		},
		Multipliers: &towpathv1.Multipliers{Constraints: []*towpathv1.RowMultipliers{{Name: "row", Values: values(1000)}}},
	}
}

func TestLargeArraysComeBackInChunks(t *testing.T) {
	a := wide()
	messages := streamOf(t, a)
	if len(messages) != 1+1+3+1 {
		t.Errorf("%d messages, want a head and five chunks", len(messages))
	}
	for _, m := range messages {
		if n := proto.Size(m); n > chunkBytes+1024 {
			t.Errorf("a message of %d bytes", n)
		}
	}
	got, err := receive(messages)
	if err != nil {
		t.Fatal(err)
	}
	if !proto.Equal(got, a) {
		t.Error("the answer changed on its way")
	}
}

func TestDamagedStreamsAreRefused(t *testing.T) {
	for name, c := range map[string]struct {
		spoil func([]*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse
		says  string
	}{
		"nothing": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse { return nil }, "no answer"},
		"no head": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse { return m[1:] }, "begin with its head"},
		"short":   {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse { return m[:3] }, "ends after"},
		"gap": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse {
			return append(m[:2], m[3:]...)
		}, "does not fit"},
		"flipped bit": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse {
			c := m[3].GetChunk()
			c.Data = bytes.Clone(c.Data)
			c.Data[5] ^= 4
			return m
		}, "damaged"},
		"unknown array": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse {
			m[1].GetChunk().Array = 77
			return m
		}, "not announced"},
		"second head": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse { return append(m[:1], m...) }, "second head"},
		"too long": {func(m []*towpathv1.FetchAnswerResponse) []*towpathv1.FetchAnswerResponse {
			m[0].GetHead().GetValues()[1].GetEntries().GetF64().GetUpload().SizeBytes = 1 << 50
			return m
		}, "at most"},
	} {
		_, err := receive(c.spoil(streamOf(t, wide())))
		if err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s: want an error about %q, got %v", name, c.says, err)
		}
	}
}

func TestNumbersInAllForms(t *testing.T) {
	array := func(b ...byte) *towpathv1.Array { return &towpathv1.Array{Place: &towpathv1.Array_Data{Data: b}} }
	one := []byte{0, 0, 0, 0, 0, 0, 0xf0, 0x3f}
	two := []byte{0, 0, 0, 0, 0, 0, 0, 0x40}
	for name, c := range map[string]struct {
		n    *towpathv1.Numbers
		want []complex128
	}{
		"absent":      {nil, nil},
		"real":        {&towpathv1.Numbers{Re: []float64{1, 2}}, []complex128{1, 2}},
		"complex":     {&towpathv1.Numbers{Re: []float64{1, 2}, Im: []float64{2, 1}}, []complex128{1 + 2i, 2 + 1i}},
		"f64":         {&towpathv1.Numbers{F64: array(append(bytes.Clone(one), two...)...)}, []complex128{1, 2}},
		"c128":        {&towpathv1.Numbers{C128: array(append(bytes.Clone(one), two...)...)}, []complex128{1 + 2i}},
		"empty array": {&towpathv1.Numbers{F64: array()}, []complex128{}},
	} {
		got, err := numbersOf(c.n)
		if err != nil || len(got) != len(c.want) {
			t.Errorf("%s: got %v, %v", name, got, err)
			continue
		}
		for k := range got {
			if got[k] != c.want[k] {
				t.Errorf("%s: got %v, want %v", name, got, c.want)
			}
		}
	}
	for name, n := range map[string]*towpathv1.Numbers{
		"uneven":    {Re: []float64{1, 2}, Im: []float64{1}},
		"cut":       {F64: array(1, 2, 3)},
		"half":      {C128: array(one...)},
		"elsewhere": {F64: &towpathv1.Array{Place: &towpathv1.Array_Upload{Upload: &towpathv1.Upload{}}}},
	} {
		if got, err := numbersOf(n); err == nil {
			t.Errorf("%s: accepted as %v", name, got)
		}
	}
}
