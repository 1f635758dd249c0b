package broker

import (
	"fmt"
	"math"
	"time"
	"unicode/utf8"

	"towpath/model"
	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/grpc/codes"
	"google.golang.org/protobuf/types/known/durationpb"
)

// Limits on what a request may carry beside a model: all of it is kept with the job.
const (
	maxLabels   = 32
	maxLabel    = 256 // bytes of a key or a value
	maxRequest  = 128 // bytes of a request_id
	maxBackends = 32
	maxName     = 256 // bytes of a sheet's or a back end's name
)

func invalid(path, place, problem, cure string) error {
	f := model.Fault{Path: path, Place: place, Problem: problem, Cure: cure}
	return &refusal{code: codes.InvalidArgument, reason: RequestInvalid, text: f.String(), faults: []model.Fault{f}}
}

// validOptions checks what a job asks for.
func validOptions(o *towpathv1.JobOptions) error {
	const place = "the options"
	if t := o.GetTolerance(); math.IsNaN(t) || t < 0 || t >= 1 {
		return invalid("options.tolerance", place, fmt.Sprintf("the tolerance is %g", t), "use a number from 0 (the default) to less than 1")
	}
	for _, x := range []struct {
		name string
		d    *durationpb.Duration
	}{{"run_limit", o.GetRunLimit()}, {"life_limit", o.GetLifeLimit()}} {
		if x.d != nil && (x.d.CheckValid() != nil || x.d.AsDuration() <= 0) {
			return invalid("options."+x.name, place, fmt.Sprintf("%s is not a positive duration", x.name), "give seconds, or leave it out for the server's limit")
		}
	}
	if o.GetMaxMemoryBytes() > math.MaxInt64 {
		return invalid("options.max_memory_bytes", place, "max_memory_bytes is larger than any machine", "leave it 0 for the server's limit")
	}
	if o.GetMaxIterations() > math.MaxInt32 {
		return invalid("options.max_iterations", place, fmt.Sprintf("max_iterations is %d", o.GetMaxIterations()), "use at most 2147483647, or 0 for the back end's default")
	}
	if n := len(o.GetBackends()); n > maxBackends {
		return invalid("options.backends", place, fmt.Sprintf("there are %d back ends", n), fmt.Sprintf("name at most %d", maxBackends))
	}
	for k, name := range o.GetBackends() {
		if len(name) > maxName {
			return invalid(fmt.Sprintf("options.backends[%d]", k), place, fmt.Sprintf("a name has %d bytes", len(name)), fmt.Sprintf("use at most %d", maxName))
		}
	}
	if n := len(o.GetSheet()); n > maxName {
		return invalid("options.sheet", place, fmt.Sprintf("a name has %d bytes", n), fmt.Sprintf("use at most %d", maxName))
	}
	return nil
}

func validLabels(labels map[string]string) error {
	if len(labels) > maxLabels {
		return invalid("labels", "the labels", fmt.Sprintf("there are %d", len(labels)), fmt.Sprintf("use at most %d", maxLabels))
	}
	for k, v := range labels {
		if k == "" || len(k) > maxLabel || len(v) > maxLabel || !utf8.ValidString(k) || !utf8.ValidString(v) {
			return invalid("labels", "the labels", "one is empty or too long", fmt.Sprintf("use keys of 1 to %d bytes and values of at most %d", maxLabel, maxLabel))
		}
	}
	return nil
}

func validSubmit(q *towpathv1.SubmitJobRequest) error {
	if err := validOptions(q.GetOptions()); err != nil {
		return err
	}
	if err := validLabels(q.GetLabels()); err != nil {
		return err
	}
	if n := len(q.GetRequestId()); n > maxRequest {
		return invalid("request_id", "the request", fmt.Sprintf("request_id has %d bytes", n), fmt.Sprintf("use at most %d", maxRequest))
	}
	return nil
}

// validWait reads how long a caller is willing to wait, at most the longest that one call may take.
func validWait(d *durationpb.Duration) (time.Duration, error) {
	const longest = 60 * time.Second
	if d == nil {
		return 0, nil
	}
	if d.CheckValid() != nil || d.AsDuration() < 0 {
		return 0, invalid("wait", "the request", "wait is not a duration of zero or more", "give seconds, or leave it out")
	}
	return min(d.AsDuration(), longest), nil
}
