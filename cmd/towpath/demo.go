package main

import (
	"context"
	"flag"
	"fmt"
	"time"

	"towpath/broker/wire"
	"towpath/model/archipelago"
	towpathv1 "towpath/proto/towpath/v1"
)

func demoCommand() command {
	return command{
		name: "demo", summary: "solve the models of an invented archipelago, natively and lowered, and compare",
		detail: "Every model goes through gRPC to a broker, once to the back end that takes complex cones natively and once\n" +
			"lowered to a real one, and to csdp where it is installed. Every answer is examined in the model's own terms.",
		prepare: func(f *flag.FlagSet) action {
			address := f.String("address", "", addressUsage)
			return func(ctx context.Context, operands []string, io streams) error {
				if err := none(operands); err != nil {
					return err
				}
				b, err := connect(*address)
				if err != nil {
					return err
				}
				defer b.close()
				return demo(ctx, b, io)
			}
		},
	}
}

// caution ends every text that could be taken for engineering advice.
const caution = `Everything here is invented and advisory. Bounds on a grid's cost, detector designs and antenna weights are planning
figures: operate grids by their operators' procedures, transmit by licensed practice, and let qualified people decide.
`

// journey is one model's journey to one sheet.
type journey struct {
	trial  trial
	answer *towpathv1.Answer
	err    error
	wall   time.Duration
}

// trial is one way of asking: a label for the table and the options that force it.
type trial struct {
	label   string
	options *towpathv1.JobOptions
}

// demo solves every case in every way and reports. Its failure says that an answer was doubtful or that answers differ.
func demo(ctx context.Context, b *broker, io streams) error {
	trials, absent, err := demoTrials(ctx, b)
	if err != nil {
		return err
	}
	cases, err := archipelago.Cases()
	if err != nil {
		return err
	}
	fmt.Fprint(io.out, "The Ormeray isles: a research station with a power grid of its own, a laboratory for single pulses of light, and a\n"+
		"coastal radar. Their models are written in complex numbers and sent as they are.\n\n")
	started := time.Now()
	journeys := make([][]journey, len(cases))
	for i, c := range cases {
		fmt.Fprintf(io.out, "%-12s %s\n", c.ID, c.Story)
		for _, t := range trials {
			start := time.Now()
			a, err := b.solve(ctx, wire.ModelToProto(c.Model), t.options, nil)
			if ctx.Err() != nil {
				return err
			}
			journeys[i] = append(journeys[i], journey{t, a, err, time.Since(start)})
		}
	}
	fmt.Fprintln(io.out)
	agreed := writeComparison(io.out, cases, journeys)
	for _, line := range absent {
		fmt.Fprintln(io.out, line)
	}
	agreed = writeKnown(io.out, cases, journeys) && agreed
	agreed = writeGridBounds(io.out, cases, journeys) && agreed
	if err := writeOperatingPoint(io.out, cases, journeys); err != nil {
		return err
	}
	fmt.Fprintf(io.out, "\n%d models, %d answers in %s\n\n%s", len(cases), len(cases)*len(trials), secondsText(time.Since(started).Seconds()), caution)
	if !agreed {
		return &failure{exitDoubtful, "the demo's answers do not all hold or agree; the tables say which"}
	}
	return nil
}

// demoTrials asks the broker what it has: both sheets of the engine inside it, and csdp where it is installed.
func demoTrials(ctx context.Context, b *broker) (trials []trial, absent []string, err error) {
	all, err := b.routes.ListBackends(ctx, &towpathv1.ListBackendsRequest{})
	if err != nil {
		return nil, nil, err
	}
	sheet := func(name string) trial {
		return trial{name, &towpathv1.JobOptions{Sheet: name, NeedMultipliers: true}}
	}
	trials = []trial{sheet("interior/complex"), sheet("interior/real")}
	for _, back := range all.GetBackends() {
		if back.GetName() != "csdp" {
			continue
		}
		if back.GetAvailable() {
			trials = append(trials, trial{"csdp", &towpathv1.JobOptions{Backends: []string{"csdp"}, NeedMultipliers: true}})
		} else {
			absent = append(absent, "csdp was left out: "+back.GetUnavailableReason())
		}
	}
	return trials, absent, nil
}
