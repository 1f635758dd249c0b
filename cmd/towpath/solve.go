package main

import (
	"context"
	"flag"
	"fmt"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/encoding/protojson"
	"google.golang.org/protobuf/proto"
)

const addressUsage = "`host:port` of a broker; empty runs one inside this process"

func solveCommand() command {
	return command{
		name: "solve", operands: "FILE", summary: "solve a model and show the examined answer",
		detail: fileHelp,
		prepare: func(f *flag.FlagSet) action {
			var job jobFlags
			var source fileFlags
			var s show
			address := f.String("address", "", addressUsage)
			asJSON := f.Bool("json", false, "write the answer as protobuf JSON and nothing else")
			progress := f.Bool("progress", false, "show every iteration on standard error, also when it is not a terminal")
			f.BoolVar(&s.values, "values", false, "show all values, in full")
			f.BoolVar(&s.multipliers, "multipliers", false, "show all multipliers, in full")
			job.declare(f)
			source.declare(f)
			return func(ctx context.Context, operands []string, io streams) error {
				options, err := job.options()
				if err != nil {
					return err
				}
				m, err := source.read(operands, io.in)
				if err != nil {
					return err
				}
				b, err := connect(*address)
				if err != nil {
					return err
				}
				defer b.close()
				name := m.GetName()
				answer, err := b.solve(ctx, m, options, newMeter(io, *progress))
				if err != nil {
					return err
				}
				return present(answer, name, *asJSON, s, io)
			}
		},
	}
}

// solve submits a model, follows the job to its end and fetches the answer. When ctx ends first, the job is withdrawn:
// nobody would fetch it.
func (b *broker) solve(ctx context.Context, m *towpathv1.Model, o *towpathv1.JobOptions, seen *meter) (*towpathv1.Answer, error) {
	job, err := b.submit(ctx, m, o)
	if err != nil {
		return nil, err
	}
	id := job.GetId()
	if seen == nil {
		job, err = b.await(ctx, job)
	} else {
		job, err = b.watch(ctx, id, seen.event)
		seen.done()
	}
	if ctx.Err() != nil {
		b.withdraw(id)
		return nil, fmt.Errorf("interrupted; job %s is withdrawn: %w", id, ctx.Err())
	}
	if err != nil {
		return nil, err
	}
	return b.answerOf(ctx, job)
}

// answerOf fetches the answer of a job that has ended, or says why there is none.
func (b *broker) answerOf(ctx context.Context, job *towpathv1.Job) (*towpathv1.Answer, error) {
	if job.GetState() != towpathv1.JobState_JOB_STATE_ANSWERED {
		text := fmt.Sprintf("job %s %s", job.GetId(), stateWord(job.GetState()))
		if f := job.GetFault(); f != nil {
			text += fmt.Sprintf(": %s (%s)", f.GetMessage(), f.GetReason())
		}
		return nil, &failure{exitUnanswered, text}
	}
	answer, err := b.fetch(ctx, job.GetId())
	if err != nil {
		return nil, fmt.Errorf("fetching the answer of job %s: %w", job.GetId(), err)
	}
	return answer, nil
}

// present writes an answer and returns the failure that its verdict asks for.
func present(a *towpathv1.Answer, name string, asJSON bool, s show, io streams) error {
	if asJSON {
		if err := writeJSON(io, a); err != nil {
			return err
		}
	} else if err := writeAnswer(io.out, a, name, s); err != nil {
		return err
	}
	switch a.GetExamination().GetVerdict() {
	case towpathv1.Verdict_VERDICT_PROVED, towpathv1.Verdict_VERDICT_CHECKED:
		return nil
	}
	return quiet(exitDoubtful)
}

func writeJSON(io streams, m proto.Message) error {
	text, err := protojson.MarshalOptions{Multiline: true, Indent: "  "}.Marshal(m)
	if err != nil {
		return err
	}
	_, err = fmt.Fprintf(io.out, "%s\n", text)
	return err
}
