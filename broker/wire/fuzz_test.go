package wire

import (
	"bytes"
	"math/rand/v2"
	"runtime"
	"testing"

	"towpath/backends/interior"
	"towpath/bridges"
	"towpath/capability"
	"towpath/model"
	"towpath/model/modeltest"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/encoding/protodelim"
	"google.golang.org/protobuf/proto"
)

// Whatever arrives: decoding, validating and planning come to an end without a panic, what passes keeps its name, and
// memory stays in proportion.
func FuzzModel(f *testing.F) {
	cases, err := modeltest.Cases()
	if err != nil {
		f.Fatal(err)
	}
	add := func(m *towpathv1.Model) {
		raw, err := proto.Marshal(m)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(raw)
	}
	for _, c := range cases[:min(20, len(cases))] {
		add(ModelToProto(c.Model))
	}
	for n := 1; n < 4; n++ {
		add(ModelToProto(sample(rand.New(rand.NewPCG(2, uint64(n))), n)))
	}
	for seed := range uint64(20) {
		m, _ := modeltest.Recipe{Seed: seed, Outcome: model.Optimal}.Make()
		add(ModelToProto(m))
	}
	add(small())
	var rules []capability.Rule
	for _, b := range bridges.All() {
		rules = append(rules, b)
	}
	var sheets []*capability.Sheet
	for _, s := range interior.New().Sheets() {
		sheets = append(sheets, &s)
	}
	f.Fuzz(func(t *testing.T, raw []byte) {
		p := &towpathv1.Model{}
		if proto.Unmarshal(raw, p) != nil {
			return
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		m, err := ModelFromProto(p)
		if err == nil {
			err = m.Validate()
		}
		runtime.ReadMemStats(&after)
		if took, most := after.TotalAlloc-before.TotalAlloc, uint64(2*16*spareNumbers+1000*len(raw)+1<<20); took > most {
			t.Errorf("%d bytes took %d bytes of memory, allowed %d", len(raw), took, most)
		}
		if err != nil {
			return
		}
		demands := capability.Summarize(m)
		for _, proposal := range capability.Plan(demands, rules, sheets, capability.Options{}) {
			if proposal.Route == nil && len(proposal.Unreachable.Reasons) == 0 {
				t.Errorf("%s is out of reach for no reason", proposal.Sheet.Name)
			}
			if proposal.Route == nil || proposal.Route.Toll.Bytes > 1<<24 {
				continue
			}
			x, err := bridges.Cross(m, proposal.Route, bridges.All())
			if err == nil {
				err = x.Lowered.Validate()
			}
			if err == nil {
				err = proposal.Sheet.Accepts(x.Lowered)
			}
			if err != nil {
				t.Errorf("a route was planned but not crossed: %v", err)
			}
		}
		if m.Starts()[len(m.Blocks)] > 1000 {
			return
		}
		again, err := ModelFromProto(ModelToProto(m))
		if err != nil {
			t.Fatalf("a valid model is not taken back: %v", err)
		}
		if ModelID(again) != ModelID(m) {
			t.Error("a valid model changes its name when it is written and read")
		}
	})
}

// Whatever a stream brings: an end without a panic, and memory in proportion.
func FuzzStream(f *testing.F) {
	var sent bytes.Buffer
	err := SendModel(ModelToProto(sample(rand.New(rand.NewPCG(2, 40)), 40)), func(q *towpathv1.UploadModelRequest) error {
		_, err := protodelim.MarshalTo(&sent, q)
		return err
	})
	if err != nil {
		f.Fatal(err)
	}
	f.Add(sent.Bytes())
	f.Add([]byte("\xc4\x9b\xf0\x01")) // announces 3.9 MB and sends nothing
	f.Fuzz(func(t *testing.T, raw []byte) {
		const limit = 1 << 20
		// Messages are cut out before memory is counted: the cutter makes room for the length that a prefix announces, which
		// in a server is gRPC's to limit, not ours.
		in := bytes.NewReader(raw)
		var messages []*towpathv1.UploadModelRequest
		var end error
		for {
			q := &towpathv1.UploadModelRequest{}
			if end = protodelim.UnmarshalFrom(in, q); end != nil {
				break
			}
			messages = append(messages, q)
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, _ = ReceiveModel(func() (*towpathv1.UploadModelRequest, error) { // any end will do
			if len(messages) == 0 {
				return nil, end
			}
			q := messages[0]
			messages = messages[1:]
			return q, nil
		}, limit, noLimit)
		runtime.ReadMemStats(&after)
		if took, most := after.TotalAlloc-before.TotalAlloc, uint64(limit+1000*len(raw)+1<<20); took > most {
			t.Errorf("%d bytes took %d bytes of memory, allowed %d", len(raw), took, most)
		}
	})
}
