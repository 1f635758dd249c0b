package main

import (
	"bytes"
	"context"
	"encoding/json"
	"math/rand/v2"
	"net"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"towpath/broker/wire"
	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc"
	"google.golang.org/grpc/credentials/insecure"
	"google.golang.org/grpc/health/grpc_health_v1"
	"google.golang.org/protobuf/encoding/protojson"
	"google.golang.org/protobuf/types/known/durationpb"
)

// lines collects what a server logs and lets tests wait for a line.
type lines struct {
	mu  sync.Mutex
	all []map[string]any
	new chan struct{} // closed and renewed with every line
}

func (l *lines) Write(p []byte) (int, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	for _, text := range bytes.Split(bytes.TrimSpace(p), []byte("\n")) {
		line := map[string]any{}
		if err := json.Unmarshal(text, &line); err != nil {
			line["not json"] = string(text)
		}
		l.all = append(l.all, line)
	}
	close(l.new)
	l.new = make(chan struct{})
	return len(p), nil
}

// await returns the first line with the message.
func (l *lines) await(t *testing.T, message string) map[string]any {
	t.Helper()
	deadline := time.After(20 * time.Second)
	for {
		l.mu.Lock()
		for _, line := range l.all {
			if line["msg"] == message {
				l.mu.Unlock()
				return line
			}
		}
		next := l.new
		l.mu.Unlock()
		select {
		case <-next:
		case <-deadline:
			t.Fatalf("no line %q in %v", message, l.all)
		}
	}
}

// start runs a server on a free port until the test ends.
func start(t *testing.T, args ...string) (address string, log *lines, signals chan<- os.Signal, code <-chan int) {
	t.Helper()
	log = &lines{new: make(chan struct{})}
	s, c := make(chan os.Signal, 2), make(chan int, 1)
	go func() {
		c <- run(append([]string{"--listen", "127.0.0.1:0"}, args...), from(nil), s, log, log)
	}()
	return log.await(t, "serving")["address"].(string), log, s, c
}

func ended(t *testing.T, code <-chan int) int {
	t.Helper()
	select {
	case c := <-code:
		return c
	case <-time.After(20 * time.Second):
		t.Fatal("the server did not end")
		return -1
	}
}

func TestServesUntilAskedToStop(t *testing.T) {
	address, log, signals, code := start(t)
	conn, err := grpc.NewClient(address, grpc.WithTransportCredentials(insecure.NewCredentials()))
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	health, err := grpc_health_v1.NewHealthClient(conn).Check(t.Context(), &grpc_health_v1.HealthCheckRequest{Service: "towpath.v1.JobService"})
	if err != nil || health.GetStatus() != grpc_health_v1.HealthCheckResponse_SERVING {
		t.Errorf("health: %v, %v", health, err)
	}
	text, err := os.ReadFile(filepath.Join("..", "towpath", "examples", "fuel-boats.json"))
	if err != nil {
		t.Fatal(err)
	}
	m := new(towpathv1.Model)
	if err := protojson.Unmarshal(text, m); err != nil {
		t.Fatal(err)
	}
	jobs := towpathv1.NewJobServiceClient(conn)
	job, err := jobs.SubmitJob(t.Context(), &towpathv1.SubmitJobRequest{Source: &towpathv1.SubmitJobRequest_Model{Model: m}})
	if err != nil {
		t.Fatal(err)
	}
	done, err := jobs.GetJob(t.Context(), &towpathv1.GetJobRequest{JobId: job.GetJob().GetId(), Wait: durationpb.New(10 * time.Second)})
	if err != nil || done.GetJob().GetState() != towpathv1.JobState_JOB_STATE_ANSWERED {
		t.Errorf("the job: %v, %v", done, err)
	}
	if sheet := log.await(t, "route chosen")["sheet"]; sheet == nil {
		t.Error("the route's line does not name the sheet")
	}
	signals <- syscall.SIGTERM
	if c := ended(t, code); c != exitServed {
		t.Errorf("ended with %d", c)
	}
	log.await(t, "drained")
	for _, line := range log.all {
		if line["not json"] != nil || line["time"] == nil || line["level"] == nil {
			t.Errorf("a line that is not of the log's form: %v", line)
		}
	}
	ctx, cancel := context.WithTimeout(t.Context(), 5*time.Second)
	defer cancel()
	if _, err := jobs.ListJobs(ctx, &towpathv1.ListJobsRequest{}); err == nil {
		t.Error("the server still answers")
	}
}

// slow is a model that keeps a back end busy for seconds: a large Hermitian matrix with many dense equalities, which the
// identity satisfies.
func slow() *towpathv1.Model {
	const order, equalities = 40, 150
	rng := rand.New(rand.NewPCG(8, 1))
	n := model.PackedLen(order)
	m := &model.Model{Blocks: []model.Block{{Field: model.Hermitian, Rows: order, Cols: order, Cone: model.PSD}}}
	for k := range n {
		m.Objective.Col = append(m.Objective.Col, uint32(k))
		m.Objective.Coef = append(m.Objective.Coef, complex(rng.Float64(), 0))
	}
	for range equalities {
		row := model.Matrix{Start: []int{0, n}, Col: m.Objective.Col}
		trace := 0.0
		for k := range n {
			z := complex(rng.NormFloat64(), rng.NormFloat64())
			if i, j := model.PackedAt(order, k); i == j {
				z = complex(real(z), 0)
				trace += real(z)
			}
			row.Z = append(row.Z, z)
		}
		m.Constraints = append(m.Constraints, model.Constraint{
			Map:  model.Map{Field: model.Real, Lin: row, Const: []complex128{complex(-trace, 0)}},
			Cone: model.Cone{Kind: model.Zero},
		})
	}
	return wire.ModelToProto(m)
}

// TestSecondSignalEndsAtOnce lets a long solve keep the drain busy.
func TestSecondSignalEndsAtOnce(t *testing.T) {
	address, log, signals, code := start(t, "--drain-time", "1m", "--workers", "1")
	conn, err := grpc.NewClient(address, grpc.WithTransportCredentials(insecure.NewCredentials()))
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close()
	_, err = towpathv1.NewJobServiceClient(conn).SubmitJob(t.Context(), &towpathv1.SubmitJobRequest{
		Source: &towpathv1.SubmitJobRequest_Model{Model: slow()}, Options: &towpathv1.JobOptions{Sheet: "interior/real"}})
	if err != nil {
		t.Fatal(err)
	}
	log.await(t, "route chosen")
	signals <- os.Interrupt
	log.await(t, "draining")
	signals <- os.Interrupt
	if c := ended(t, code); c != exitForced {
		t.Errorf("ended with %d, want %d", c, exitForced)
	}
	log.await(t, "ending at once")
}

func TestWhatCannotServeSaysSo(t *testing.T) {
	taken, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer taken.Close()
	for _, c := range []struct {
		args []string
		code int
		says string
	}{
		{[]string{"--listen", taken.Addr().String()}, exitFailed, "cannot listen"},
		{[]string{"--workers", "none"}, exitFailed, "towpathd --help"},
		{[]string{"--help"}, exitServed, "TOWPATH_LISTEN"},
	} {
		var out bytes.Buffer
		if code := run(c.args, from(nil), nil, &out, &out); code != c.code || !strings.Contains(out.String(), c.says) {
			t.Errorf("%v: code %d, %s", c.args, code, out.String())
		}
	}
}
