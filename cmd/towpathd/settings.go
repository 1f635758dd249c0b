package main

import (
	"errors"
	"flag"
	"fmt"
	"io"
	"net"
	"runtime"
	"strings"
	"text/tabwriter"
	"time"

	"towpath/broker"

	"go.uber.org/zap/zapcore"
)

// settings are all that can be set from outside, by option or by environment.
type settings struct {
	listen      string
	unprotected bool
	workers     int
	queue       int
	runLimit    time.Duration
	lifeLimit   time.Duration
	memoryLimit uint64
	storeLimit  int64
	uploadLimit uint64
	modelLife   time.Duration
	retain      int
	drain       time.Duration
	logLevel    zapcore.Level
}

func (s *settings) declare(f *flag.FlagSet) {
	f.StringVar(&s.listen, "listen", "127.0.0.1:7433", "serve gRPC at this `host:port`; port 0 takes any free one and logs it")
	f.BoolVar(&s.unprotected, "serve-unprotected", false,
		"allow an address that other machines reach; there is no encryption and no login yet, so whoever reaches it may use it")
	f.IntVar(&s.workers, "workers", max(1, runtime.NumCPU()), "solve this `number` of jobs at the same time")
	f.IntVar(&s.queue, "queue-limit", 1000, "refuse jobs when this `number` is waiting")
	f.DurationVar(&s.runLimit, "run-limit", time.Hour, "stop a solve after this `duration`; jobs may ask for less")
	f.DurationVar(&s.lifeLimit, "life-limit", 24*time.Hour, "expire a job this `duration` after its submission; jobs may ask for less")
	f.Uint64Var(&s.memoryLimit, "memory-limit", 0,
		"refuse solves predicted to need more than this many `bytes`; 0 takes this machine's memory less the store's, shared by the workers")
	f.Int64Var(&s.storeLimit, "store-limit", 2<<30, "keep at most this many `bytes` of models and answers; the oldest answers go first")
	f.Uint64Var(&s.uploadLimit, "upload-limit", 1<<30, "refuse uploaded models whose arrays have more than this many `bytes`")
	f.DurationVar(&s.modelLife, "model-lifetime", time.Hour, "keep an uploaded model that no job uses for this `duration`")
	f.IntVar(&s.retain, "retain", 1000, "keep this `number` of ended jobs; the oldest go first")
	f.DurationVar(&s.drain, "drain-time", 20*time.Second, "on SIGTERM or SIGINT, give running jobs this `duration` before they are stopped")
	f.TextVar(&s.logLevel, "log-level", zapcore.InfoLevel, "log at this `level` and above: debug, info, warn or error")
}

// variable is the environment's name for an option: TOWPATH_RUN_LIMIT for run-limit.
func variable(option string) string {
	return "TOWPATH_" + strings.ToUpper(strings.ReplaceAll(option, "-", "_"))
}

// parseSettings reads the environment, then the options, which win. It returns flag.ErrHelp when help was asked for.
func parseSettings(args []string, lookup func(string) (string, bool)) (*settings, error) {
	s := new(settings)
	f := newFlagSet(s)
	var fromEnvironment error
	f.VisitAll(func(o *flag.Flag) {
		if value, ok := lookup(variable(o.Name)); ok && fromEnvironment == nil {
			if err := f.Set(o.Name, value); err != nil {
				fromEnvironment = fmt.Errorf("environment variable %s=%q: %w", variable(o.Name), value, err)
			}
		}
	})
	if fromEnvironment != nil {
		return nil, fromEnvironment
	}
	if err := f.Parse(args); err != nil {
		if errors.Is(err, flag.ErrHelp) {
			return nil, err
		}
		return nil, fmt.Errorf("%w; towpathd --help lists the options", err)
	}
	if f.NArg() > 0 {
		return nil, fmt.Errorf("%q: towpathd takes options only; towpathd --help lists them", f.Arg(0))
	}
	return s, s.validate()
}

func newFlagSet(s *settings) *flag.FlagSet {
	f := flag.NewFlagSet("towpathd", flag.ContinueOnError)
	f.SetOutput(io.Discard)
	f.Usage = func() {}
	s.declare(f)
	return f
}

func (s *settings) validate() error {
	switch {
	case s.workers < 1:
		return fmt.Errorf("--workers %d: give at least 1", s.workers)
	case s.queue < 1:
		return fmt.Errorf("--queue-limit %d: give at least 1", s.queue)
	case s.runLimit <= 0 || s.lifeLimit <= 0:
		return fmt.Errorf("--run-limit %s and --life-limit %s: both must be positive", s.runLimit, s.lifeLimit)
	case s.storeLimit < 1 || s.uploadLimit < 1:
		return fmt.Errorf("--store-limit %d and --upload-limit %d: both must be positive", s.storeLimit, s.uploadLimit)
	case s.modelLife <= 0:
		return fmt.Errorf("--model-lifetime %s: must be positive", s.modelLife)
	case s.retain < 1:
		return fmt.Errorf("--retain %d: give at least 1", s.retain)
	case s.drain <= 0:
		return fmt.Errorf("--drain-time %s: must be positive; 1ms stops running jobs at once", s.drain)
	}
	host, _, err := net.SplitHostPort(s.listen)
	if err != nil {
		return fmt.Errorf("--listen %s: %v; give host:port", s.listen, err)
	}
	if !loopback(host) && !s.unprotected {
		return fmt.Errorf("--listen %s: other machines may reach this address, and there is no encryption and no login yet; "+
			"listen on 127.0.0.1, or say --serve-unprotected where the network itself keeps strangers out", s.listen)
	}
	return nil
}

// config is what the broker is told of the settings. All of them are positive or have zero for the default, as there.
func (s *settings) config() broker.Config {
	return broker.Config{
		Workers: s.workers, QueueLimit: s.queue, RunLimit: s.runLimit, LifeLimit: s.lifeLimit, MemoryLimit: s.memoryLimit,
		StoreLimit: s.storeLimit, UploadLimit: s.uploadLimit, ModelLifetime: s.modelLife, Retain: s.retain, Grace: s.drain,
	}
}

// loopback reports whether only this machine reaches the host. A name other than localhost could mean anything.
func loopback(host string) bool {
	if host == "localhost" {
		return true
	}
	ip := net.ParseIP(host)
	return ip != nil && ip.IsLoopback()
}

func writeHelp(w io.Writer) {
	fmt.Fprint(w, "towpathd serves the Towpath solver broker over gRPC. It logs JSON lines to standard error.\n\n"+
		"Options may also be set in the environment; an option wins over a variable.\n\n")
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	newFlagSet(new(settings)).VisitAll(func(o *flag.Flag) {
		kind, usage := flag.UnquoteUsage(o)
		if o.DefValue != "" && o.DefValue != "false" {
			usage += " (default " + o.DefValue + ")"
		}
		fmt.Fprintf(t, "  --%s %s\t%s\t%s\n", o.Name, kind, variable(o.Name), usage)
	})
	t.Flush()
	fmt.Fprint(w, "\nThe standard health service and reflection are served at the same address.\n"+
		"On SIGTERM or SIGINT the server stops taking jobs, lets running ones finish within --drain-time, then stops them.\n"+
		"A second signal ends it at once.\n\n"+
		"Exit codes: 0 served until asked to stop, 1 wrong settings or cannot serve, 2 ended by a second signal.\n")
}
