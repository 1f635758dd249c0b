package child

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// script is a command that runs a shell text: the tests need children that misbehave, the drivers never use a shell.
func script(text string) Command { return Command{Path: "/bin/sh", Args: []string{"-c", text}} }

func leftovers(t *testing.T) []string {
	t.Helper()
	found, err := filepath.Glob(filepath.Join(os.TempDir(), "towpath-*"))
	if err != nil {
		t.Fatal(err)
	}
	return found
}

func TestRunReportsAll(t *testing.T) {
	t.Setenv("TMPDIR", t.TempDir())
	c := script("cat in; echo; echo two; echo three > out; pwd; exit 7")
	c.Files = map[string][]byte{"in": []byte("one")}
	c.Read = []string{"out", "absent"}
	var seen []string
	c.Line = func(l string) { seen = append(seen, l) }
	r, err := Run(t.Context(), c)
	if err != nil {
		t.Fatal(err)
	}
	if r.Code != 7 || len(seen) != 3 || seen[0] != "one" || seen[1] != "two" {
		t.Errorf("code %d, lines %q", r.Code, seen)
	}
	if string(r.Files["out"]) != "three\n" || r.Files["absent"] != nil {
		t.Errorf("files %q", r.Files)
	}
	if r.Peak <= 0 {
		t.Errorf("peak memory %d", r.Peak)
	}
	if left := leftovers(t); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}

// A hanging child and its own children are gone soon after the context ends.
func TestKillsTheWholeGroup(t *testing.T) {
	t.Setenv("TMPDIR", t.TempDir())
	ctx, cancel := context.WithCancel(t.Context())
	started := make(chan string, 1)
	c := script("sleep 300 & echo $!; wait")
	c.Line = func(l string) { started <- l }
	done := make(chan error, 1)
	go func() {
		_, err := Run(ctx, c)
		done <- err
	}()
	grandchild := <-started
	cancel()
	select {
	case err := <-done:
		if !errors.Is(err, context.Canceled) {
			t.Errorf("error %v, want the context's", err)
		}
	case <-time.After(10 * time.Second):
		t.Fatal("the child was not killed")
	}
	if !gone(grandchild) {
		t.Errorf("process %s lives on", grandchild)
	}
	if left := leftovers(t); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}

// gone waits until a process has ended (its entry may stay as a zombie that nobody collects).
func gone(pid string) bool {
	for range 200 {
		stat, err := os.ReadFile("/proc/" + pid + "/stat")
		if err != nil || strings.Contains(string(stat), ") Z ") {
			return true
		}
		time.Sleep(10 * time.Millisecond)
	}
	return false
}

// A child that ends and leaves one of its own behind: that one is killed, too.
func TestKillsWhatIsLeftBehind(t *testing.T) {
	c := script("sleep 300 >/dev/null 2>&1 & echo $!")
	var pid string
	c.Line = func(l string) { pid = l }
	if _, err := Run(t.Context(), c); err != nil {
		t.Fatal(err)
	}
	if !gone(pid) {
		t.Errorf("process %s lives on", pid)
	}
}

func TestFloodIsBounded(t *testing.T) {
	r, err := Run(t.Context(), script("head -c 50000000 /dev/zero"))
	if err != nil {
		t.Fatal(err)
	}
	if len(r.Output) > outputLimit {
		t.Errorf("%d bytes were kept", len(r.Output))
	}
}

func TestMemoryIsLimited(t *testing.T) {
	c := script("sleep 0.2; x=$(head -c 300000000 /dev/zero | tr '\\0' 'x'); echo ${#x}")
	c.MaxMemory = 100 << 20
	r, err := Run(t.Context(), c)
	if err != nil {
		t.Fatal(err)
	}
	if r.Code == 0 && strings.Contains(r.Output, "300000000") {
		t.Error("the child took 300 MB of 100 allowed")
	}
}

// Only plain files are read: no pipe keeps the reader, no link leads out of the private directory.
func TestOnlyPlainFilesAreRead(t *testing.T) {
	secret := filepath.Join(t.TempDir(), "secret")
	if err := os.WriteFile(secret, []byte("not yours"), 0o600); err != nil {
		t.Fatal(err)
	}
	for name, text := range map[string]string{"pipe": "mkfifo pipe", "link": "ln -s '" + secret + "' link", "folder": "mkdir folder"} {
		c := script(text)
		c.Read = []string{name}
		if r, err := Run(t.Context(), c); err == nil || len(r.Files) > 0 {
			t.Errorf("%s: read %q, %v", name, r.Files, err)
		}
	}
}

func TestMissingProgram(t *testing.T) {
	if _, err := Run(t.Context(), Command{Path: "/nonexistent/solver"}); !errors.Is(err, ErrNotRun) {
		t.Errorf("error %v", err)
	}
}

func TestEnvironmentIsSmall(t *testing.T) {
	t.Setenv("SECRET_OF_THE_SERVER", "x")
	r, err := Run(t.Context(), script("env"))
	if err != nil {
		t.Fatal(err)
	}
	if strings.Contains(r.Output, "SECRET") {
		t.Error("the server's environment reaches the child")
	}
}
