package main

import (
	"context"
	"flag"
	"fmt"

	towpathv1 "towpath/proto/towpath/v1"
)

// Commands about one job of a broker in another process.

func watchCommand() command {
	return command{
		name: "watch", operands: "JOB", summary: "follow a job's changes and its solver's progress until it ends",
		prepare: func(f *flag.FlagSet) action {
			address := f.String("address", defaultAddress, jobAddressUsage)
			return func(ctx context.Context, operands []string, io streams) error {
				return withJob(*address, operands, func(b *broker, id string) error {
					job, err := b.watch(ctx, id, func(e *towpathv1.WatchJobResponse) {
						if text := eventText(e); text != "" {
							fmt.Fprintln(io.out, text)
						}
					})
					if err != nil {
						return err
					}
					if job.GetState() != towpathv1.JobState_JOB_STATE_ANSWERED {
						return quiet(exitUnanswered)
					}
					switch job.GetVerdict() {
					case towpathv1.Verdict_VERDICT_PROVED, towpathv1.Verdict_VERDICT_CHECKED:
						return nil
					}
					return quiet(exitDoubtful)
				})
			}
		},
	}
}

func fetchCommand() command {
	return command{
		name: "fetch", operands: "JOB", summary: "show the examined answer of a job",
		prepare: func(f *flag.FlagSet) action {
			address := f.String("address", defaultAddress, jobAddressUsage)
			asJSON := f.Bool("json", false, "write the answer as protobuf JSON and nothing else")
			var s show
			f.BoolVar(&s.values, "values", false, "show all values, in full")
			f.BoolVar(&s.multipliers, "multipliers", false, "show all multipliers, in full")
			return func(ctx context.Context, operands []string, io streams) error {
				return withJob(*address, operands, func(b *broker, id string) error {
					response, err := b.jobs.GetJob(ctx, &towpathv1.GetJobRequest{JobId: id})
					if err != nil {
						return err
					}
					job := response.GetJob()
					if !ended(job.GetState()) {
						return &failure{exitUnanswered, fmt.Sprintf("job %s is %s; towpath watch %s follows it", id, stateWord(job.GetState()), id)}
					}
					answer, err := b.answerOf(ctx, job)
					if err != nil {
						return err
					}
					return present(answer, job.GetModelName(), *asJSON, s, io)
				})
			}
		},
	}
}

func withdrawCommand() command {
	return command{
		name: "withdraw", operands: "JOB", summary: "stop a job, also one that is running",
		prepare: func(f *flag.FlagSet) action {
			address := f.String("address", defaultAddress, jobAddressUsage)
			return func(ctx context.Context, operands []string, io streams) error {
				return withJob(*address, operands, func(b *broker, id string) error {
					response, err := b.jobs.WithdrawJob(ctx, &towpathv1.WithdrawJobRequest{JobId: id})
					if err != nil {
						return err
					}
					fmt.Fprintf(io.out, "job %s %s\n", response.GetJob().GetId(), stateWord(response.GetJob().GetState()))
					return nil
				})
			}
		},
	}
}

func withJob(address string, operands []string, do func(b *broker, id string) error) error {
	if len(operands) != 1 {
		return usageError("give one job; towpath jobs lists them")
	}
	b, err := dial(address)
	if err != nil {
		return err
	}
	defer b.close()
	return do(b, operands[0])
}
