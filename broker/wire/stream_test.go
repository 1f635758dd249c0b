package wire

import (
	"errors"
	"hash/crc32"
	"io"
	"math/rand/v2"
	"runtime"
	"strings"
	"testing"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/proto"
)

// played returns the messages one after the other, then the end.
func played[M any](messages []M) func() (M, error) {
	return func() (m M, err error) {
		if len(messages) == 0 {
			return m, io.EOF
		}
		m, messages = messages[0], messages[1:]
		return m, nil
	}
}

func noLimit(uint64) error { return nil }

func TestModelsThroughStreams(t *testing.T) {
	for _, n := range []int{1, 40, 200} {
		m := sample(rand.New(rand.NewPCG(1, uint64(n))), n)
		var sent []*towpathv1.UploadModelRequest
		chunks := 0
		err := SendModel(ModelToProto(m), func(q *towpathv1.UploadModelRequest) error {
			sent = append(sent, overWire(t, q, &towpathv1.UploadModelRequest{}))
			if q.GetChunk() != nil {
				chunks++
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		if (n > 1) != (chunks > 0) {
			t.Errorf("n = %d: %d chunks", n, chunks)
		}
		var asked uint64
		got, err := ReceiveModel(played(sent), 1<<30, func(bytes uint64) error { asked += bytes; return nil })
		if err != nil {
			t.Fatal(err)
		}
		back, err := ModelFromProto(got)
		if err != nil {
			t.Fatal(err)
		}
		sameModel(t, back, m)
		if asked < uint64(proto.Size(ModelToProto(m))) {
			t.Errorf("room was asked for %d bytes, the model has %d", asked, proto.Size(ModelToProto(m)))
		}
	}
}

// A head of very many small parts goes in pieces, each within gRPC's limit, and comes back in order.
func TestHeadsInPieces(t *testing.T) {
	m := &towpathv1.Model{Name: "many", Objective: &towpathv1.Objective{Constant: 3}}
	a := &towpathv1.Answer{Note: "many", Multipliers: &towpathv1.Multipliers{}, Examination: &towpathv1.Examination{Reasons: []string{"one", "two"}},
		Certificate: &towpathv1.Certificate{Proof: &towpathv1.Certificate_Infeasibility{Infeasibility: &towpathv1.Multipliers{}}}}
	name := strings.Repeat("n", 200)
	for k := range 15_000 {
		m.Blocks = append(m.Blocks, &towpathv1.Block{Name: name, Rows: uint64(k)})
		y := &towpathv1.RowMultipliers{Name: name, Rows: uint64(k), Values: &towpathv1.Numbers{Re: []float64{float64(k)}}}
		a.Multipliers.Constraints = append(a.Multipliers.Constraints, y)
		a.Certificate.GetInfeasibility().Constraints = append(a.Certificate.GetInfeasibility().Constraints, y)
		a.Examination.Constraints = append(a.Examination.Constraints, &towpathv1.ConstraintResiduals{Number: uint32(k), Name: name})
	}
	var up []*towpathv1.UploadModelRequest
	if err := SendModel(proto.CloneOf(m), func(q *towpathv1.UploadModelRequest) error { up = append(up, q); return nil }); err != nil {
		t.Fatal(err)
	}
	var down []*towpathv1.FetchAnswerResponse
	if err := SendAnswer(proto.CloneOf(a), func(r *towpathv1.FetchAnswerResponse) error { down = append(down, r); return nil }); err != nil {
		t.Fatal(err)
	}
	if len(up) < 2 || len(down) < 5 {
		t.Fatalf("%d and %d pieces", len(up), len(down))
	}
	for _, q := range up {
		if n := proto.Size(q); n > headBytes+framing {
			t.Errorf("a piece has %d bytes", n)
		}
	}
	for _, r := range down {
		if n := proto.Size(r); n > headBytes+framing {
			t.Errorf("a piece has %d bytes", n)
		}
	}
	gotModel, err := ReceiveModel(played(up), 0, noLimit)
	if err != nil || !proto.Equal(gotModel, m) {
		t.Errorf("the model changed on its way (%v)", err)
	}
	gotAnswer, err := ReceiveAnswer(played(down))
	if err != nil || !proto.Equal(gotAnswer, a) {
		t.Errorf("the answer changed on its way (%v)", err)
	}
}

// Every way to break a stream, with the exact words that come back.
func TestStreamFaults(t *testing.T) {
	announced := func(sizes ...uint64) *towpathv1.UploadModelRequest {
		m := &towpathv1.Model{}
		for k, size := range sizes {
			a := &towpathv1.Array{Place: &towpathv1.Array_Upload{Upload: &towpathv1.Upload{Id: uint32(7 + k), SizeBytes: size}}}
			m.Blocks = append(m.Blocks, &towpathv1.Block{Lower: &towpathv1.Numbers{F64: a}})
		}
		return &towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Head{Head: m}}
	}
	chunk := func(id uint32, at uint64, data string) *towpathv1.UploadModelRequest {
		return &towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Chunk{Chunk: &towpathv1.Chunk{
			Array: id, OffsetBytes: at, Data: []byte(data), Crc32C: crc32.Checksum([]byte(data), castagnoli)}}}
	}
	damaged := chunk(7, 0, "12345678")
	damaged.GetChunk().Data[3] ^= 1
	twice := announced(8, 8)
	twice.GetHead().GetBlocks()[1].GetLower().GetF64().GetUpload().Id = 7
	big := &towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_More{More: &towpathv1.Model{Name: strings.Repeat("x", largestHead)}}}
	type stream = []*towpathv1.UploadModelRequest
	for _, c := range []struct {
		s    stream
		says string
	}{
		{nil, "the stream: it is empty; send the head first"},
		{stream{chunk(7, 0, "x")}, "the stream: it does not begin with a head; send the head first"},
		{stream{{}}, "the stream: it does not begin with a head; send the head first"},
		{stream{announced(8), announced(8)}, "the stream: after the head and its chunks there is another part; send one head, more of it, then chunks"},
		{stream{announced(8), chunk(7, 0, "1234"), {Part: &towpathv1.UploadModelRequest_More{}}}, "the stream: after the head and its chunks there is another part; send one head, more of it, then chunks"},
		{stream{announced(8), big}, "the head: it has more than 67108864 bytes; put coefficients and numbers into arrays"},
		{stream{twice}, "array 7: it is announced twice; give every array its own number"},
		{stream{announced(8), chunk(9, 0, "x")}, "array 9: it has a chunk but was not announced; announce every array in the head"},
		{stream{announced(8), chunk(7, 0, "")}, "array 7: a chunk is empty; leave it out"},
		{stream{announced(1 << 21), chunk(7, 0, strings.Repeat("x", ChunkBytes+1))}, "array 7: a chunk has 1048577 bytes; send at most 1048576"},
		{stream{announced(8), chunk(7, 4, "1234")}, "array 7: a chunk at byte 4 follows byte 0; send the chunks of an array in order, without gaps"},
		{stream{announced(8), chunk(7, 0, "1234"), chunk(7, 0, "1234")}, "array 7: a chunk at byte 0 follows byte 4; send the chunks of an array in order, without gaps"},
		{stream{announced(8), chunk(7, 0, "1234"), chunk(7, 4, "12345")}, "array 7: its chunks exceed the announced 8 bytes; announce the true size"},
		{stream{announced(8), damaged}, "array 7: the chunk at byte 0 does not match its checksum; send it again; the checksum is CRC-32C"},
		{stream{announced(8, 8), chunk(7, 0, "12345678"), chunk(8, 0, "1234")}, "array 8: it ends after 4 of 8 bytes; send all chunks before closing the stream"},
		{stream{announced(8)}, "array 7: it ends after 0 of 8 bytes; send all chunks before closing the stream"},
		{stream{announced(60, 60)}, "the announced arrays are larger than the 100 bytes taken; split the model, or ask for a higher limit"},
		{stream{announced(1<<63, 1<<63)}, "the announced arrays are larger than the 100 bytes taken; split the model, or ask for a higher limit"},
	} {
		limit := uint64(100)
		if c.s != nil && len(c.s[0].GetHead().GetBlocks()) == 1 {
			limit = 1 << 22
		}
		if _, err := ReceiveModel(played(c.s), limit, noLimit); err == nil || err.Error() != c.says {
			t.Errorf("got  %v\nwant %s", err, c.says)
		}
	}
	full, reset := errors.New("full"), errors.New("reset")
	if _, err := ReceiveModel(played(stream{announced(8)}), 100, func(uint64) error { return full }); !errors.Is(err, full) {
		t.Errorf("without room: %v", err)
	}
	messages := played(stream{announced(8), chunk(7, 0, "1234")})
	_, err := ReceiveModel(func() (*towpathv1.UploadModelRequest, error) {
		if q, err := messages(); err == nil {
			return q, nil
		}
		return nil, reset
	}, 100, noLimit)
	if !errors.Is(err, reset) {
		t.Errorf("a broken connection: %v", err)
	}
}

// An announcement alone allocates nothing.
func TestAnnouncementsAreFree(t *testing.T) {
	a := &towpathv1.Array{Place: &towpathv1.Array_Upload{Upload: &towpathv1.Upload{SizeBytes: 1 << 30}}}
	head := &towpathv1.UploadModelRequest{Part: &towpathv1.UploadModelRequest_Head{Head: &towpathv1.Model{Blocks: []*towpathv1.Block{{Lower: &towpathv1.Numbers{F64: a}}}}}}
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, err := ReceiveModel(played([]*towpathv1.UploadModelRequest{head}), 2<<30, noLimit)
	runtime.ReadMemStats(&after)
	if err == nil {
		t.Error("an array that never came was accepted")
	}
	if took := after.TotalAlloc - before.TotalAlloc; took > 1<<20 {
		t.Errorf("took %d bytes", took)
	}
}
