package csdp

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"towpath/backends"
	"towpath/model"
	"towpath/model/check"
)

// installed drives the real program, or skips the test.
func installed(t *testing.T) *Driver {
	t.Helper()
	path, ok := Find()
	if !ok {
		t.Skip("csdp is not here, its quirks are NOT tested; install the Debian package " + Package)
	}
	return New(path)
}

// solve runs a driver under a watch and holds it to leaving nothing behind: no file in the folder for temporary files, no
// process that works there.
func solve(ctx context.Context, t *testing.T, d *Driver, sheet string, m *model.Model, o backends.Options) (*model.Answer, error) {
	t.Helper()
	valid(t, m)
	dir := t.TempDir()
	t.Setenv("TMPDIR", dir)
	type result struct {
		a   *model.Answer
		err error
	}
	done := make(chan result, 1)
	go func() {
		a, err := d.Solve(ctx, sheet, m, o)
		done <- result{a, err}
	}()
	select {
	case r := <-done:
		if left, err := os.ReadDir(dir); err != nil || len(left) > 0 {
			t.Errorf("left behind: %v, %v", left, err)
		}
		if !deserted(t, dir) {
			t.Errorf("processes still work in %s", dir)
		}
		return r.a, r.err
	case <-time.After(time.Minute):
		t.Fatal("the driver does not come back")
	}
	return nil, nil
}

// deserted waits until no process has its working directory below dir. A killed process takes a moment to be gone.
func deserted(t *testing.T, dir string) bool {
	t.Helper()
	for range 500 {
		links, err := filepath.Glob("/proc/[0-9]*/cwd")
		if err != nil || len(links) == 0 {
			t.Fatalf("processes cannot be seen: %v", err)
		}
		busy := false
		for _, l := range links {
			at, err := os.Readlink(l) // a process that has ended, or is another's, has no link to read
			busy = busy || err == nil && strings.HasPrefix(at, dir)
		}
		if !busy {
			return true
		}
		time.Sleep(10 * time.Millisecond)
	}
	return false
}

// examined solves with the real program and examines the answer.
func examined(t *testing.T, d *Driver, sheet string, m *model.Model, o backends.Options) (*model.Answer, check.Report) {
	t.Helper()
	a, err := solve(t.Context(), t, d, sheet, m, o)
	if err != nil {
		t.Fatal(err)
	}
	return a, check.Examine(m, a, check.Tolerances{})
}
