package main

import (
	"flag"
	"fmt"
	"math"
	"strings"
	"time"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/types/known/durationpb"
)

// jobFlags are what a job may ask of its route and its solve.
type jobFlags struct {
	sheet            string
	backends         list
	tolerance        float64
	iterations       uint
	timeLimit        time.Duration
	memoryLimit      uint64
	needMultipliers  bool
	needCertificates bool
}

func (j *jobFlags) declare(f *flag.FlagSet) {
	f.StringVar(&j.sheet, "sheet", "", "solve under this `sheet` only, like interior/complex (towpath backends lists them)")
	f.Var(&j.backends, "backend", "allow only this `backend`; may be repeated")
	f.Float64Var(&j.tolerance, "tolerance", 0, "relative `accuracy` for the solve and its examination; 0 takes the defaults")
	f.UintVar(&j.iterations, "max-iterations", 0, "limit the back end's iterations to this `number`; 0 takes its default")
	f.DurationVar(&j.timeLimit, "time-limit", 0, "limit the solve to this `duration`, like 30s; 0 takes the broker's limit")
	f.Uint64Var(&j.memoryLimit, "memory-limit", 0, "limit the solve's memory to this many `bytes`; 0 takes the broker's limit")
	f.BoolVar(&j.needMultipliers, "need-multipliers", false, "use only routes that bring multipliers back")
	f.BoolVar(&j.needCertificates, "need-certificates", false, "use only routes that bring certificates back")
}

func (j *jobFlags) options() (*towpathv1.JobOptions, error) {
	if j.tolerance < 0 || j.tolerance >= 1 || math.IsNaN(j.tolerance) {
		return nil, usageError("--tolerance %g: give a number from 0 (default) to below 1, like 1e-7", j.tolerance)
	}
	if j.timeLimit < 0 {
		return nil, usageError("--time-limit %s: must not be negative", j.timeLimit)
	}
	if uint64(j.iterations) > math.MaxUint32 {
		return nil, usageError("--max-iterations %d: at most %d", j.iterations, uint32(math.MaxUint32))
	}
	o := &towpathv1.JobOptions{
		Sheet:            j.sheet,
		Backends:         j.backends,
		Tolerance:        j.tolerance,
		MaxIterations:    uint32(j.iterations),
		MaxMemoryBytes:   j.memoryLimit,
		NeedMultipliers:  j.needMultipliers,
		NeedCertificates: j.needCertificates,
	}
	if j.timeLimit > 0 {
		o.RunLimit = durationpb.New(j.timeLimit)
	}
	return o, nil
}

// list is an option that may be repeated.
type list []string

func (l *list) String() string { return strings.Join(*l, ",") }

func (l *list) Set(s string) error {
	if s == "" {
		return fmt.Errorf("empty name")
	}
	*l = append(*l, s)
	return nil
}
