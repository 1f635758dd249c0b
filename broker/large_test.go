package broker

import (
	"encoding/binary"
	"math"
	"net"
	"os"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"towpath/broker/wire"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/credentials/insecure"
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
	const model = rows * each * (16 + 4)
	grown := peak(t) - before
	t.Logf("%d coefficients, %.0f MB of arrays, peak memory grew by %.0f MB", rows*each, model/1e6, float64(grown)/1e6)
	if clear && grown > 4*model {
		t.Errorf("peak memory grew by %d bytes, more than four times the model", grown)
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
