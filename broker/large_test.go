package broker

import (
	"encoding/binary"
	"fmt"
	"math"
	"net"
	"os"
	"runtime"
	"runtime/debug"
	"strconv"
	"strings"
	"testing"

	"towpath/broker/wire"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/credentials/insecure"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/proto"
)

// Ten million complex coefficients, 200 MB with their columns, through TCP under gRPC's default limit of 4 MiB for one
// message. What the process takes at most is counted in copies of the model: the client's, the server's arrays, and what
// the store keeps.
func TestTenMillionComplexCoefficients(t *testing.T) {
	if testing.Short() {
		t.Skip("moves 200 MB")
	}
	const columns, rows, each = 1000, 20_000, 500
	m := manyRows(columns, rows, each)
	s := newStation(t, Config{}, &puppet{"tug", 1, honestly})
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	served := make(chan error, 1)
	go func() { served <- s.server.Serve(l) }()
	conn, err := grpc.NewClient(l.Addr().String(), grpc.WithTransportCredentials(insecure.NewCredentials()))
	if err != nil {
		t.Fatal(err)
	}
	jobs := towpathv1.NewJobServiceClient(conn)
	// What is needed is to be measured, not how far the collector lets garbage grow, which depends on what ran before.
	runtime.GC()
	defer debug.SetGCPercent(debug.SetGCPercent(25))
	clear := resetPeak(t)
	stream, err := jobs.UploadModel(s.ctx())
	if err != nil {
		t.Fatal(err)
	}
	before := peak(t)
	if err := wire.SendModel(m, stream.Send); err != nil {
		t.Fatal(err)
	}
	r, err := stream.CloseAndRecv()
	if err != nil {
		t.Fatal(err)
	}
	const size = rows * each * (16 + 4)
	grown := peak(t) - before
	t.Logf("%d coefficients, %.0f MB of arrays, peak memory grew by %.0f MB", rows*each, size/1e6, float64(grown)/1e6)
	if clear && grown > 3*size {
		t.Errorf("peak memory grew by %d bytes, more than three times the model", grown)
	}
	if len(r.GetModelId()) != 64 {
		t.Errorf("named '%s'", r.GetModelId())
	}
	plan, err := towpathv1.NewRouteServiceClient(conn).PlanRoutes(s.ctx(), &towpathv1.PlanRoutesRequest{Source: &towpathv1.PlanRoutesRequest_ModelId{ModelId: r.GetModelId()}})
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range plan.GetDemands() {
		if d.GetKind() == "map/complex/zero" && (d.GetCount() != rows || d.GetNonzeros() != rows*each) {
			t.Errorf("arrived as %v", d)
		}
	}
	if err := conn.Close(); err != nil {
		t.Fatal(err)
	}
	s.server.Stop()
	if err := <-served; err != nil {
		t.Errorf("serving ended with %v", err)
	}
}

// Models and answers of very many small parts pass, too: neither is ever one message.
func TestVeryManySmallConstraints(t *testing.T) {
	if testing.Short() {
		t.Skip("80 000 constraints")
	}
	const n = 80_000
	m := smallest()
	first := m.GetConstraints()[0]
	y := &model.Multipliers{Constraints: [][]complex128{{1}}, Bounds: [][]complex128{nil}}
	for k := range n - 1 {
		c := proto.CloneOf(first)
		c.Name = fmt.Sprintf("at least one, said again for the %dth time", k)
		m.Constraints = append(m.Constraints, c)
		y.Constraints = append(y.Constraints, []complex128{0})
	}
	answer := right()
	answer.Multipliers = y
	s := newStation(t, Config{}, &puppet{"tug", 1, answering(answer)})
	_, err := s.try(m, nil)
	if status.Code(err) != codes.ResourceExhausted {
		t.Errorf("as one message: %v", err)
	}
	a := s.answerUploaded(proto.CloneOf(m))
	if got := a.GetMultipliers().GetConstraints(); len(got) != n || got[0].GetValues().GetRe()[0] != 1 || got[n-1].GetName() != m.GetConstraints()[n-1].GetName() {
		t.Errorf("%d multipliers", len(got))
	}
	if v := a.GetExamination(); v.GetVerdict() != towpathv1.Verdict_VERDICT_CHECKED || len(v.GetConstraints()) != n {
		t.Errorf("verdict %v on %d constraints", v.GetVerdict(), len(v.GetConstraints()))
	}
}

// An answer over gRPC's limit for one message comes in chunks.
func TestLargeAnswers(t *testing.T) {
	const n = 1_000_000 // 8 MB
	m := smallest()
	m.Constraints = nil
	m.Blocks[0].Rows = n
	point := make([]complex128, n)
	for k := range point {
		point[k] = complex(float64(k), 0)
	}
	point[0] = 0
	s := newStation(t, Config{}, &puppet{"tug", 1, answering(&model.Answer{Outcome: model.Optimal, Point: &model.Point{Values: [][]complex128{point}},
		Multipliers: &model.Multipliers{Constraints: [][]complex128{}, Bounds: [][]complex128{nil}}})})
	a := s.answer(m, nil)
	data := a.GetValues()[0].GetEntries().GetF64().GetData()
	if len(data) != 8*n || math.Float64frombits(binary.LittleEndian.Uint64(data[8*(n-1):])) != n-1 {
		t.Errorf("%d bytes came back", len(data))
	}
	if v := a.GetExamination().GetVerdict(); v != towpathv1.Verdict_VERDICT_CHECKED {
		t.Errorf("verdict %v: %v", v, a.GetExamination().GetReasons())
	}
}

// answerUploaded uploads a model, which is changed, solves it and returns its answer.
func (s *station) answerUploaded(m *towpathv1.Model) *towpathv1.Answer {
	s.t.Helper()
	stream, err := s.jobs.UploadModel(s.ctx())
	if err != nil {
		s.t.Fatal(err)
	}
	if err := wire.SendModel(m, stream.Send); err != nil {
		s.t.Fatal(err)
	}
	r, err := stream.CloseAndRecv()
	if err != nil {
		s.t.Fatal(err)
	}
	job, err := s.jobs.SubmitJob(s.ctx(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_ModelId{ModelId: r.GetModelId()}})
	if err != nil {
		s.t.Fatal(err)
	}
	s.wait(job.GetJob().GetId(), towpathv1.JobState_JOB_STATE_ANSWERED)
	a, err := s.fetch(job.GetJob().GetId())
	if err != nil {
		s.t.Fatal(err)
	}
	return a
}

// manyRows is a model with complex equality rows of so many coefficients each.
func manyRows(columns, rows, each int) *towpathv1.Model {
	starts, cols, values := make([]byte, 0, 8*(rows+1)), make([]byte, 0, 4*rows*each), make([]byte, 0, 16*rows*each)
	for r := range rows {
		starts = binary.LittleEndian.AppendUint64(starts, uint64(r*each))
		for k := range each {
			cols = binary.LittleEndian.AppendUint32(cols, uint32(k*(columns/each)+r%(columns/each)))
			values = binary.LittleEndian.AppendUint64(values, math.Float64bits(float64(r+k)))
			values = binary.LittleEndian.AppendUint64(values, math.Float64bits(float64(r-k)))
		}
	}
	starts = binary.LittleEndian.AppendUint64(starts, uint64(rows*each))
	array := func(data []byte) *towpathv1.Array {
		return &towpathv1.Array{Place: &towpathv1.Array_Data{Data: data}}
	}
	return &towpathv1.Model{
		Blocks: []*towpathv1.Block{{Name: "z", Field: towpathv1.Field_FIELD_COMPLEX, Rows: uint64(columns)}},
		Constraints: []*towpathv1.Constraint{{Field: towpathv1.Field_FIELD_COMPLEX, Rows: uint64(rows), Cone: towpathv1.Cone_CONE_ZERO,
			Coefficients: &towpathv1.CompressedRows{Starts: array(starts), Columns: array(cols), C128: array(values)}}},
	}
}

// resetPeak sets the peak of resident memory back to what is resident now, where the system can (Linux).
func resetPeak(t *testing.T) bool {
	t.Helper()
	runtime.GC()
	if err := os.WriteFile("/proc/self/clear_refs", []byte("5"), 0); err != nil {
		t.Logf("peak memory cannot be measured here: %v", err)
		return false
	}
	return true
}

// peak returns the peak of resident memory in bytes, 0 where the system does not say.
func peak(t *testing.T) int64 {
	t.Helper()
	text, err := os.ReadFile("/proc/self/status")
	if err != nil {
		return 0
	}
	for line := range strings.Lines(string(text)) {
		if f := strings.Fields(line); len(f) == 3 && f[0] == "VmHWM:" {
			n, err := strconv.ParseInt(f[1], 10, 64)
			if err != nil {
				t.Fatal(err)
			}
			return n << 10
		}
	}
	return 0
}
