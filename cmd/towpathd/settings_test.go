package main

import (
	"bytes"
	"errors"
	"flag"
	"strings"
	"testing"
	"time"
)

func from(env map[string]string) func(string) (string, bool) {
	return func(name string) (string, bool) { v, ok := env[name]; return v, ok }
}

func TestOptionsWinOverEnvironment(t *testing.T) {
	env := from(map[string]string{"TOWPATH_WORKERS": "3", "TOWPATH_DRAIN_TIME": "7s", "TOWPATH_LOG_LEVEL": "debug"})
	s, err := parseSettings([]string{"--workers", "5"}, env)
	if err != nil {
		t.Fatal(err)
	}
	if s.workers != 5 || s.drain != 7*time.Second || s.logLevel.String() != "debug" || s.listen != "127.0.0.1:7433" {
		t.Errorf("got %+v", s)
	}
}

func TestOnlyLoopbackWithoutAsking(t *testing.T) {
	for address, ok := range map[string]bool{
		"127.0.0.1:1": true, "[::1]:1": true, "localhost:1": true, "127.8.0.1:0": true,
		":7433": false, "0.0.0.0:1": false, "[::]:1": false, "10.0.0.4:1": false, "broker.example:1": false,
	} {
		_, err := parseSettings([]string{"--listen", address}, from(nil))
		if (err == nil) != ok {
			t.Errorf("%s: %v", address, err)
		}
		if err != nil && !strings.Contains(err.Error(), "no encryption and no login") {
			t.Errorf("%s: the refusal does not say why: %v", address, err)
		}
		if _, err := parseSettings([]string{"--listen", address, "--serve-unprotected"}, from(nil)); err != nil {
			t.Errorf("%s, asked for: %v", address, err)
		}
	}
}

func TestSettingsThatCannotBe(t *testing.T) {
	for _, c := range []struct {
		args []string
		env  map[string]string
		says string
	}{
		{args: []string{"--workers", "0"}, says: "--workers 0"},
		{args: []string{"--queue-limit", "-1"}, says: "--queue-limit"},
		{args: []string{"--run-limit", "0s"}, says: "--run-limit"},
		{args: []string{"--memory-limit", "-1"}, says: "memory-limit"},
		{args: []string{"--store-limit", "0"}, says: "--store-limit 0"},
		{args: []string{"--upload-limit", "0"}, says: "--upload-limit 0"},
		{args: []string{"--model-lifetime", "0s"}, says: "--model-lifetime"},
		{args: []string{"--retain", "0"}, says: "--retain"},
		{args: []string{"--drain-time", "0s"}, says: "--drain-time"},
		{args: []string{"--drain-time", "-1s"}, says: "--drain-time"},
		{args: []string{"--listen", "7433"}, says: "give host:port"},
		{args: []string{"--log-level", "loud"}, says: "log-level"},
		{args: []string{"--unknown"}, says: "--help lists"},
		{args: []string{"serve"}, says: "options only"},
		{env: map[string]string{"TOWPATH_WORKERS": "many"}, says: `TOWPATH_WORKERS="many"`},
	} {
		_, err := parseSettings(c.args, from(c.env))
		if err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%v %v: want an error about %q, got %v", c.args, c.env, c.says, err)
		}
	}
}

func TestHelpNamesEveryOptionAndVariable(t *testing.T) {
	if _, err := parseSettings([]string{"--help"}, from(nil)); !errors.Is(err, flag.ErrHelp) {
		t.Fatalf("got %v", err)
	}
	var out bytes.Buffer
	writeHelp(&out)
	newFlagSet(new(settings)).VisitAll(func(o *flag.Flag) {
		if !strings.Contains(out.String(), "--"+o.Name) || !strings.Contains(out.String(), variable(o.Name)) {
			t.Errorf("help does not name --%s and %s", o.Name, variable(o.Name))
		}
	})
}
