package main

import (
	"context"
	"flag"
	"fmt"
	"sort"
	"strings"
	"text/tabwriter"

	towpathv1 "towpath/proto/towpath/v1"
)

// defaultAddress is where towpathd listens unless it is told otherwise. A broker inside this process has no jobs but
// the one that it was started for.
const defaultAddress = "127.0.0.1:7433"

const jobAddressUsage = "`host:port` of the broker"

func jobsCommand() command {
	return command{
		name: "jobs", summary: "list the broker's jobs, newest first",
		prepare: func(f *flag.FlagSet) action {
			address := f.String("address", defaultAddress, jobAddressUsage)
			limit := f.Int("limit", 50, "show at most this `number` of jobs")
			asJSON := f.Bool("json", false, "write the list as protobuf JSON and nothing else")
			var states, labels list
			f.Var(&states, "state", "only jobs in this `state`, like running; may be repeated")
			f.Var(&labels, "label", "only jobs with this label, `name=value`; may be repeated")
			return func(ctx context.Context, operands []string, io streams) error {
				if err := none(operands); err != nil {
					return err
				}
				request, err := listRequest(*limit, states, labels)
				if err != nil {
					return err
				}
				b, err := dial(*address)
				if err != nil {
					return err
				}
				defer b.close()
				all, err := b.list(ctx, request, *limit)
				if err != nil {
					return err
				}
				if *asJSON {
					return writeJSON(io, all)
				}
				writeJobs(io, all)
				return nil
			}
		},
	}
}

func listRequest(limit int, states, labels list) (*towpathv1.ListJobsRequest, error) {
	if limit < 1 {
		return nil, usageError("--limit %d: give at least 1", limit)
	}
	r := &towpathv1.ListJobsRequest{Labels: map[string]string{}}
	for _, s := range states {
		number, ok := towpathv1.JobState_value["JOB_STATE_"+strings.ToUpper(s)]
		if !ok || number == 0 {
			return nil, usageError("--state %s: there are waiting, routed, running, answered, failed, withdrawn and expired", s)
		}
		r.States = append(r.States, towpathv1.JobState(number))
	}
	for _, l := range labels {
		name, value, ok := strings.Cut(l, "=")
		if !ok || name == "" {
			return nil, usageError("--label %s: write name=value", l)
		}
		r.Labels[name] = value
	}
	return r, nil
}

// list turns pages until there are enough jobs.
func (b *broker) list(ctx context.Context, r *towpathv1.ListJobsRequest, limit int) (*towpathv1.ListJobsResponse, error) {
	const largestPage = 1000
	all := new(towpathv1.ListJobsResponse)
	for {
		r.PageSize = int32(min(limit-len(all.Jobs), largestPage))
		page, err := b.jobs.ListJobs(ctx, r)
		if err != nil {
			return nil, err
		}
		all.Jobs = append(all.Jobs, page.GetJobs()...)
		all.NextPageToken = page.GetNextPageToken()
		if len(all.Jobs) >= limit || all.NextPageToken == "" {
			return all, nil
		}
		r.PageToken = all.NextPageToken
	}
}

func writeJobs(io streams, all *towpathv1.ListJobsResponse) {
	if len(all.GetJobs()) == 0 {
		fmt.Fprintln(io.out, "no jobs")
		return
	}
	t := tabwriter.NewWriter(io.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(t, "job\tstate\toutcome\tverdict\tsubmitted\ttook\tsheet\tmodel\tlabels\tremark")
	for _, j := range all.GetJobs() {
		outcome, verdict := "-", "-"
		if j.GetState() == towpathv1.JobState_JOB_STATE_ANSWERED {
			outcome, verdict = outcomeWord(j.GetOutcome()), verdictWord(j.GetVerdict())
		}
		took := "-"
		if j.GetStartTime() != nil && j.GetEndTime() != nil {
			took = secondsText(j.GetEndTime().AsTime().Sub(j.GetStartTime().AsTime()).Seconds())
		}
		remark := j.GetWaitingReason()
		if j.GetFault() != nil {
			remark = j.GetFault().GetMessage()
		}
		fmt.Fprintf(t, "%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s\n", j.GetId(), stateWord(j.GetState()), outcome, verdict,
			j.GetSubmitTime().AsTime().Local().Format("2006-01-02 15:04:05"), took, orDash(j.GetRoute().GetSheet()),
			orDash(j.GetModelName()), orDash(labelText(j.GetLabels())), orDash(remark))
	}
	t.Flush()
	if all.GetNextPageToken() != "" {
		fmt.Fprintln(io.out, "there are older jobs; --limit shows more")
	}
}

func labelText(labels map[string]string) string {
	var parts []string
	for name, value := range labels {
		parts = append(parts, name+"="+value)
	}
	sort.Strings(parts)
	return strings.Join(parts, ",")
}

func orDash(s string) string {
	if s == "" {
		return "-"
	}
	return s
}

func none(operands []string) error {
	if len(operands) > 0 {
		return usageError("%q: this command takes options only", operands[0])
	}
	return nil
}
