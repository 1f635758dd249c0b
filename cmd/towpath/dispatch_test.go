package main

import (
	"bytes"
	"flag"
	"fmt"
	"slices"
	"strings"
	"testing"
)

// towpath runs the command as main does, without a process.
func towpath(t *testing.T, stdin string, args ...string) (code int, stdout, stderr string) {
	t.Helper()
	var out, err bytes.Buffer
	code = run(t.Context(), args, streams{in: strings.NewReader(stdin), out: &out, err: &err})
	return code, out.String(), err.String()
}

func TestHelpIsComplete(t *testing.T) {
	code, out, _ := towpath(t, "", "help")
	if code != exitAnswered {
		t.Errorf("help ends with %d", code)
	}
	for _, c := range commands() {
		if !strings.Contains(out, "towpath "+c.name) {
			t.Errorf("help does not name %s", c.name)
		}
		code, text, _ := towpath(t, "", "help", c.name)
		flags, _ := c.flagSet()
		flags.VisitAll(func(f *flag.Flag) {
			if code != exitAnswered || !strings.Contains(text, "--"+f.Name) {
				t.Errorf("help %s does not name --%s", c.name, f.Name)
			}
		})
		if code, again, _ := towpath(t, "", c.name, "--help"); code != exitAnswered || again != text {
			t.Errorf("%s --help differs from help %s", c.name, c.name)
		}
	}
	for _, code := range []int{exitAnswered, exitUsage, exitDoubtful, exitUnanswered, exitUnreachable, exitInterrupted} {
		if !strings.Contains(out, fmt.Sprintf("\n  %-3d  ", code)) {
			t.Errorf("help does not explain exit code %d", code)
		}
	}
}

func TestWrongWordsAreExplained(t *testing.T) {
	for _, c := range []struct {
		args string
		says string
	}{
		{"", "no command given"},
		{"sovle x", `no command "sovle"`},
		{"help sovle", `no command "sovle"`},
		{"solve", "give one model file"},
		{"solve a b", "give one model file"},
		{"solve --sheets x a.json", "towpath help solve"},
		{"solve a.json --tolerance -1", "--tolerance -1"},
		{"solve a.json --tolerance NaN", "--tolerance NaN"},
		{"solve a.json --time-limit -1s", "--time-limit"},
		{"solve a.json --max-iterations 5000000000", "--max-iterations"},
		{"solve nowhere.json", "nowhere.json"},
		{"solve go.mod --format xyz", "go.mod"},
		{"jobs --limit 0", "--limit 0"},
		{"jobs --state lost", "--state lost"},
		{"jobs --label x", "--label x"},
		{"jobs x", "options only"},
		{"demo x", "options only"},
		{"backends x", "options only"},
		{"watch", "give one job"},
		{"fetch a b", "give one job"},
		{"withdraw", "give one job"},
	} {
		code, out, err := towpath(t, "", strings.Fields(c.args)...)
		last := err[strings.LastIndex(strings.TrimRight(err, "\n"), "\n")+1:]
		if code != exitUsage || out != "" || !strings.HasPrefix(last, "towpath: ") || !strings.Contains(last, c.says) {
			t.Errorf("towpath %s: code %d, want 1 and one line about %q, got %q, output %q", c.args, code, c.says, err, out)
		}
	}
}

func TestNobodyAtTheAddress(t *testing.T) {
	code, _, err := towpath(t, "", "backends", "--address", "127.0.0.1:1")
	if code != exitUnreachable || !strings.Contains(err, "is towpathd running") {
		t.Errorf("code %d, %q", code, err)
	}
}

func TestOptionsStandAnywhere(t *testing.T) {
	for _, args := range [][]string{
		{"--a", "1", "x", "y"}, {"x", "--a", "1", "y"}, {"x", "y", "--a=1"},
	} {
		f := flag.NewFlagSet("t", flag.ContinueOnError)
		a := f.Int("a", 0, "")
		rest, err := parse(f, args)
		if err != nil || *a != 1 || !slices.Equal(rest, []string{"x", "y"}) {
			t.Errorf("%v: a=%d, rest %v, %v", args, *a, rest, err)
		}
	}
	f := flag.NewFlagSet("t", flag.ContinueOnError)
	f.Int("a", 0, "")
	if rest, err := parse(f, []string{"x", "--", "--a", "-"}); err != nil || !slices.Equal(rest, []string{"x", "--a", "-"}) {
		t.Errorf("after --: %v, %v", rest, err)
	}
	if rest, err := parse(flag.NewFlagSet("t", flag.ContinueOnError), []string{"-"}); err != nil || !slices.Equal(rest, []string{"-"}) {
		t.Errorf("standard input: %v, %v", rest, err)
	}
}
