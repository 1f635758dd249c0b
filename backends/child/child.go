// Package child runs solver programs as child processes that cannot hurt the server: a private directory, a process group
// of their own that is killed whole, limits on memory and output, a small environment, never a shell.
package child

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"sync"
	"syscall"
	"time"

	"golang.org/x/sys/unix"
)

// Command is one run of a program.
type Command struct {
	Path  string            // absolute path of the program
	Args  []string          // relative names refer to the private directory
	Files map[string][]byte // written into the private directory before the start
	Read  []string          // read from it after the end; missing ones are left out of the result
	// Line is called with every line of standard output as it comes, if not nil.
	Line func(line string)
	// MaxMemory limits the address space in bytes; 0 for no limit.
	MaxMemory int64
}

// Result of a run.
type Result struct {
	Code   int // exit code; -1 when a signal ended it
	Output string
	Files  map[string][]byte
	User   time.Duration // processor time of the child
	Peak   int64         // its largest resident size in bytes
}

const (
	// outputLimit bounds the standard output kept, and the length of a line.
	outputLimit = 1 << 20
	// fileLimit bounds every file that the child writes, and what is read of it.
	fileLimit = 4 << 30
	// patience is how long a killed child's pipes may stay open.
	patience = 2 * time.Second
)

// ErrNotRun wraps errors of a program that could not be started.
var ErrNotRun = errors.New("the program could not be run")

// Run runs the command to its end. When ctx ends first, the whole process group is killed and ctx's error is returned
// with what there is. The private directory is removed in any case.
func Run(ctx context.Context, c Command) (*Result, error) {
	dir, err := os.MkdirTemp("", "towpath-")
	if err != nil {
		return nil, fmt.Errorf("%w: %w", ErrNotRun, err)
	}
	defer os.RemoveAll(dir)
	for name, data := range c.Files {
		if err := os.WriteFile(filepath.Join(dir, name), data, 0o600); err != nil {
			return nil, fmt.Errorf("%w: %w", ErrNotRun, err)
		}
	}
	out := &lines{each: c.Line}
	cmd := exec.Command(c.Path, c.Args...)
	cmd.Dir, cmd.Env, cmd.Stdout, cmd.Stderr = dir, environment(dir), out, out
	cmd.WaitDelay = patience
	// The child dies with this process. The death signal belongs to the starting thread, which therefore must live as
	// long as the child: lock it.
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true, Pdeathsig: syscall.SIGKILL}
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	if err := cmd.Start(); err != nil {
		return nil, fmt.Errorf("%w: %w", ErrNotRun, err)
	}
	limit(cmd.Process.Pid, c.MaxMemory)
	ended := make(chan struct{})
	var watch sync.WaitGroup
	watch.Go(func() {
		select {
		case <-ctx.Done():
		case <-ended:
		}
		// Also after an orderly end: nothing that the child started may stay.
		_ = syscall.Kill(-cmd.Process.Pid, syscall.SIGKILL) // no such group any more is fine
	})
	err = cmd.Wait()
	close(ended)
	watch.Wait()
	out.flush()
	r := &Result{Code: cmd.ProcessState.ExitCode(), Output: out.kept.String(), Files: map[string][]byte{}, User: cmd.ProcessState.UserTime()}
	if usage, ok := cmd.ProcessState.SysUsage().(*syscall.Rusage); ok {
		r.Peak = usage.Maxrss << 10
	}
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) && !errors.Is(err, exec.ErrWaitDelay) {
		return r, fmt.Errorf("%w: %w", ErrNotRun, err)
	}
	if err := ctx.Err(); err != nil {
		return r, err
	}
	for _, name := range c.Read {
		data, err := readBounded(filepath.Join(dir, name))
		if err == nil {
			r.Files[name] = data
		} else if !errors.Is(err, os.ErrNotExist) {
			return r, fmt.Errorf("reading %s: %w", name, err)
		}
	}
	return r, nil
}

// environment passes on what a numerical program needs and nothing else: one thread, because the broker runs several
// children side by side, and the choice of kernels that the machine's operator made.
func environment(dir string) []string {
	env := []string{"PATH=/usr/bin:/bin", "HOME=" + dir, "TMPDIR=" + dir, "LC_ALL=C", "OPENBLAS_NUM_THREADS=1", "OMP_NUM_THREADS=1"}
	for _, name := range []string{"OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"} {
		if v, ok := os.LookupEnv(name); ok {
			env = append(env, name+"="+v)
		}
	}
	return env
}

// limit sets the child's limits as soon as it runs. A child that has ended already needs none, so errors do not matter.
func limit(pid int, memory int64) {
	set := func(what int, n uint64) {
		_ = unix.Prlimit(pid, what, &unix.Rlimit{Cur: n, Max: n}, nil)
	}
	set(unix.RLIMIT_FSIZE, fileLimit)
	set(unix.RLIMIT_CORE, 0)
	if memory > 0 {
		set(unix.RLIMIT_AS, uint64(memory))
	}
}

// readBounded reads a plain file. The child may have put anything in its place: a link to a file that is not its own, a pipe
// that nobody writes to.
func readBounded(path string) ([]byte, error) {
	f, err := os.OpenFile(path, os.O_RDONLY|unix.O_NOFOLLOW|unix.O_NONBLOCK, 0)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	if info, err := f.Stat(); err != nil || !info.Mode().IsRegular() {
		return nil, errors.New("not a plain file")
	}
	data, err := io.ReadAll(io.LimitReader(f, fileLimit+1))
	if err == nil && len(data) > fileLimit {
		err = fmt.Errorf("more than %d bytes", fileLimit)
	}
	return data, err
}

// lines keeps the beginning of an output and hands out its lines.
type lines struct {
	kept bytes.Buffer
	part []byte
	each func(string)
}

// Write implements io.Writer. It never fails: a child that floods its output is read and forgotten.
func (l *lines) Write(p []byte) (int, error) {
	if room := outputLimit - l.kept.Len(); room > 0 {
		l.kept.Write(p[:min(room, len(p))])
	}
	if l.each == nil {
		return len(p), nil
	}
	l.part = append(l.part, p...)
	for {
		end := bytes.IndexByte(l.part, '\n')
		if end < 0 {
			break
		}
		l.each(string(l.part[:end]))
		l.part = l.part[end+1:]
	}
	if len(l.part) > outputLimit {
		l.part = nil
	}
	return len(p), nil
}

func (l *lines) flush() {
	if l.each != nil && len(l.part) > 0 {
		l.each(string(l.part))
	}
}
