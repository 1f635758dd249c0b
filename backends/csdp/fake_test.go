package csdp

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"towpath/backends"
	"towpath/backends/child"
	"towpath/model"
)

// fake is a program that is not csdp: a shell text in its place. The driver itself never uses a shell.
func fake(t *testing.T, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "csdp")
	if err := os.WriteFile(path, []byte("#!/bin/sh\n"+text+"\n"), 0o700); err != nil {
		t.Fatal(err)
	}
	return path
}

const iteration = "echo 'Iter:  0 Ap: 0.00e+00 Pobj:  1.0e+00 Ad: 0.00e+00 Dobj:  1.0e+00 '\n"

// A program that leaves a good file is believed, whatever else it does: so the refusals below are not for want of a chance.
func TestFakeThatAnswers(t *testing.T) {
	p := reader(t)
	for name, text := range map[string]string{
		"plain":                       "cat > out <<end\n" + good + "end",
		"reads what it is given":      "test \"$1 $2\" = 'in.dat-s out' && grep -q '^axtol=' param.csdp && head -n 1 $1 | grep -q '^2$' || exit 201\ncat > out <<end\n" + good + "end",
		"after a flood":               "head -c 20000000 /dev/zero\ncat > out <<end\n" + good + "end",
		"with a child that lives on":  "sleep 300 >/dev/null 2>&1 &\ncat > out <<end\n" + good + "end",
		"with other files about":      "mkdir -p a/b; echo x > a/b/c; ln -s / root; chmod 0 param.csdp\ncat > out <<end\n" + good + "end",
		"with much on standard error": "head -c 20000000 /dev/zero >&2\ncat > out <<end\n" + good + "end",
	} {
		t.Run(name, func(t *testing.T) {
			a, err := solve(t.Context(), t, &Driver{path: fake(t, text)}, EqualitySheet, p.m, backends.Options{Progress: func(backends.Progress) {}})
			if err != nil || a.Outcome != model.Optimal || a.Objective != 41.875 {
				t.Errorf("%+v, %v", a, err)
			}
		})
	}
}

// A program that ends without a sound solution gives an error that says so, in few words.
func TestFakeThatFails(t *testing.T) {
	p := reader(t)
	for _, c := range []struct{ name, text, want string }{
		{"writes nothing", "exit 0", "csdp ended with code 0 and no solution: "},
		{"says success and writes nothing", "echo 'Success: SDP solved'", "csdp ended with code 0 and no solution: Success: SDP solved"},
		{"writes an empty file", ": > out", "csdp's solution file: it is empty"},
		{"writes garbage", `printf '\377\000\001garbage\n' > out`, `csdp's solution file: "\xff\x00\x01garbage" is not a number in range`},
		{"writes zeros", "head -c 10000000 /dev/zero > out", "csdp's solution file: it ends within a line"},
		{"writes half", "printf '1.5 -2\\n2 1 1 1 0.25\\n' > out", "csdp's solution file: it is cut short"},
		{"writes its input", "cp in.dat-s out", "csdp's solution file: it has 1 multipliers for 2 rows"},
		{"makes a folder of it", "mkdir out", "csdp: reading out: "},
		{"ends with 139", "cp in.dat-s out; exit 139", "csdp ended with code 139 and no solution: "},
		{"dies of a signal", "kill -SEGV $$", "csdp ended with code -1 and no solution: "},
		{"kills its group", "kill -KILL 0", "csdp ended with code -1 and no solution: "},
		{"floods and fails", "head -c 20000000 /dev/zero; exit 201", "csdp ended with code 201 and no solution: "},
		{"floods with lines", iteration + "yes | head -n 1000000; exit 201", "csdp ended with code 201 and no solution: "},
		{"floods with one line of bytes", `head -c 20000000 /dev/zero | tr '\0' '\377'; exit 206`, "csdp ended with code 206 and no solution: "},
		{"leaves a child on its output", "sleep 300 & exit 7", "csdp ended with code 7 and no solution: "},
		{"removes its folder", `rm -rf "$PWD"`, "csdp ended with code 0 and no solution: "},
	} {
		t.Run(c.name, func(t *testing.T) {
			a, err := solve(t.Context(), t, &Driver{path: fake(t, c.text)}, EqualitySheet, p.m, backends.Options{Progress: func(backends.Progress) {}})
			if err == nil {
				t.Fatalf("answered %+v", a)
			}
			if text := err.Error(); !strings.HasPrefix(text, c.want) || len(text) > 700 {
				t.Errorf("error %.700q, want %q", text, c.want)
			}
		})
	}
}

// A program that does not end is killed with all that it started when the context ends.
func TestFakeThatHangs(t *testing.T) {
	p := reader(t)
	for name, text := range map[string]string{
		"sleeps":                      iteration + "sleep 300",
		"sleeps beside a child":       "sleep 300 & sleep 300 &\n" + iteration + "wait",
		"takes no hints":              "trap '' HUP INT TERM\n" + iteration + "while :; do sleep 1; done",
		"is busy":                     iteration + "while :; do :; done",
		"floods":                      iteration + "yes",
		"floods without line ends":    iteration + "cat /dev/zero",
		"has a good file, then hangs": "cat > out <<end\n" + good + "end\n" + iteration + "sleep 300",
		"closes its output":           iteration + "exec >&- 2>&-; sleep 300",
	} {
		stopped := func(t *testing.T, a *model.Answer, err error) {
			t.Helper()
			if err != nil || a.Outcome != model.Stopped || a.Point != nil || a.Multipliers != nil {
				t.Errorf("%+v, %v", a, err)
			}
		}
		t.Run(name+", withdrawn", func(t *testing.T) {
			ctx, cancel := context.WithCancel(t.Context())
			defer cancel()
			reports := 0
			a, err := solve(ctx, t, &Driver{path: fake(t, text)}, EqualitySheet, p.m, backends.Options{Progress: func(backends.Progress) {
				reports++
				cancel()
			}})
			stopped(t, a, err)
			if reports != 1 {
				t.Errorf("%d reports of one iteration", reports)
			}
		})
		t.Run(name+", past its deadline", func(t *testing.T) {
			ctx, cancel := context.WithTimeout(t.Context(), 100*time.Millisecond)
			defer cancel()
			a, err := solve(ctx, t, &Driver{path: fake(t, text)}, EqualitySheet, p.m, backends.Options{})
			stopped(t, a, err)
		})
	}
}

// Without a program, or with one that cannot be started, the error says that nothing ran.
func TestFakeThatCannotRun(t *testing.T) {
	p := reader(t)
	plain := filepath.Join(t.TempDir(), "csdp")
	if err := os.WriteFile(plain, []byte("not a program"), 0o600); err != nil {
		t.Fatal(err)
	}
	for name, path := range map[string]string{"absent": plain + "-absent", "not executable": plain, "a folder": t.TempDir(), "without an interpreter": fake(t, "")} {
		t.Run(name, func(t *testing.T) {
			if name == "without an interpreter" {
				if err := os.WriteFile(path, []byte("#!/nonexistent/sh\n"), 0o700); err != nil {
					t.Fatal(err)
				}
			}
			if a, err := solve(t.Context(), t, &Driver{path: path}, EqualitySheet, p.m, backends.Options{}); !errors.Is(err, child.ErrNotRun) || !strings.HasPrefix(err.Error(), "csdp: ") {
				t.Errorf("%+v, %v", a, err)
			}
		})
	}
}

// The version is read from what the program says, and unknown where it says nothing of the kind or cannot run.
func TestVersion(t *testing.T) {
	for text, want := range map[string]string{
		"echo 'CSDP 6.2.0'": "6.2.0",
		"echo 'This is CSDP 7.0rc1, built today'; exit 3": "7.0rc1",
		"exit 0":                            "unknown",
		"head -c 5000000 /dev/zero; exit 1": "unknown",
		"kill -SEGV $$":                     "unknown",
	} {
		for _, s := range New(fake(t, text)).Sheets() {
			if s.Version != want || s.Backend != "csdp" {
				t.Errorf("%q: %s %s, want %s", text, s.Backend, s.Version, want)
			}
		}
	}
	if v := New("/nonexistent/csdp").Sheets()[0].Version; v != "unknown" {
		t.Errorf("an absent program has version %s", v)
	}
}
