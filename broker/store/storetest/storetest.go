// Package storetest says what a store owes the broker. Every implementation runs it.
package storetest

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"towpath/broker/store"
)

// Run checks the stores that open returns, each of them empty.
func Run(t *testing.T, open func(t *testing.T) (store.Records, store.Blobs)) {
	for _, c := range []struct {
		name string
		test func(*testing.T, store.Records, store.Blobs)
	}{
		{"create once", createOnce},
		{"swap at revision", swapAtRevision},
		{"one winner", oneWinner},
		{"delete", deleteRecord},
		{"keys", keys},
		{"values are copied", copies},
		{"watch", watch},
		{"watch ends", watchEnds},
		{"blobs", blobs},
	} {
		t.Run(c.name, func(t *testing.T) {
			r, b := open(t)
			c.test(t, r, b)
		})
	}
}

func must[T any](t *testing.T, v T, err error) T {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	return v
}

func want(t *testing.T, err, target error) {
	t.Helper()
	if !errors.Is(err, target) {
		t.Fatalf("error %v, want %v", err, target)
	}
}

func createOnce(t *testing.T, r store.Records, _ store.Blobs) {
	ctx := t.Context()
	rev, err := r.Create(ctx, "job/1", []byte("a"))
	must(t, rev, err)
	_, err = r.Create(ctx, "job/1", []byte("b"))
	want(t, err, store.ErrExists)
	v, at, err := r.Get(ctx, "job/1")
	must(t, v, err)
	if string(v) != "a" || at != rev {
		t.Errorf("got %q at %d, want \"a\" at %d", v, at, rev)
	}
	_, _, err = r.Get(ctx, "job/2")
	want(t, err, store.ErrMissing)
}

func swapAtRevision(t *testing.T, r store.Records, _ store.Blobs) {
	ctx := t.Context()
	rev, err := r.Create(ctx, "k", []byte("a"))
	must(t, rev, err)
	next, err := r.Swap(ctx, "k", []byte("b"), rev)
	if must(t, next, err) <= rev {
		t.Errorf("revision %d does not rise from %d", next, rev)
	}
	_, err = r.Swap(ctx, "k", []byte("c"), rev)
	want(t, err, store.ErrChanged)
	_, err = r.Swap(ctx, "none", []byte("c"), rev)
	want(t, err, store.ErrMissing)
}

// oneWinner lets many swap from the same revision: exactly one may succeed.
func oneWinner(t *testing.T, r store.Records, _ store.Blobs) {
	ctx := t.Context()
	rev, err := r.Create(ctx, "k", nil)
	must(t, rev, err)
	var won atomic.Int32
	var all sync.WaitGroup
	for i := range 32 {
		all.Go(func() {
			if _, err := r.Swap(ctx, "k", []byte{byte(i)}, rev); err == nil {
				won.Add(1)
			}
		})
	}
	all.Wait()
	if won.Load() != 1 {
		t.Errorf("%d of 32 won", won.Load())
	}
}

func deleteRecord(t *testing.T, r store.Records, _ store.Blobs) {
	ctx := t.Context()
	rev, err := r.Create(ctx, "k", nil)
	must(t, rev, err)
	want(t, r.Delete(ctx, "k", rev+1), store.ErrChanged)
	if err := r.Delete(ctx, "k", rev); err != nil {
		t.Fatal(err)
	}
	want(t, r.Delete(ctx, "k", rev), store.ErrMissing)
}

func keys(t *testing.T, r store.Records, _ store.Blobs) {
	ctx := t.Context()
	for _, k := range []string{"b/2", "a/1", "b/1"} {
		rev, err := r.Create(ctx, k, nil)
		must(t, rev, err)
	}
	got, err := r.Keys(ctx, "b/")
	must(t, got, err)
	if fmt.Sprint(got) != "[b/1 b/2]" {
		t.Errorf("keys %v", got)
	}
}

func copies(t *testing.T, r store.Records, _ store.Blobs) {
	ctx := t.Context()
	v := []byte("abc")
	rev, err := r.Create(ctx, "k", v)
	must(t, rev, err)
	v[0] = 'x'
	got, _, err := r.Get(ctx, "k")
	must(t, got, err)
	got[1] = 'x'
	again, _, err := r.Get(ctx, "k")
	if string(must(t, again, err)) != "abc" {
		t.Errorf("the stored value was changed from outside to %q", again)
	}
}

// watch checks that the last change of every key arrives, in order of revision.
func watch(t *testing.T, r store.Records, _ store.Blobs) {
	ctx, cancel := context.WithTimeout(t.Context(), 10*time.Second)
	defer cancel()
	changes, err := r.Watch(ctx)
	must(t, changes, err)
	const n = 100
	last := map[string]uint64{}
	for i := range n {
		k := fmt.Sprint("k", i%7)
		if _, rev, err := r.Get(ctx, k); err == nil {
			rev, err = r.Swap(ctx, k, []byte{byte(i)}, rev)
			last[k] = must(t, rev, err)
			continue
		}
		rev, err := r.Create(ctx, k, []byte{byte(i)})
		last[k] = must(t, rev, err)
	}
	seen := uint64(0)
	for len(last) > 0 {
		select {
		case c := <-changes:
			if c.Revision <= seen {
				t.Fatalf("revision %d after %d", c.Revision, seen)
			}
			seen = c.Revision
			if last[c.Key] == c.Revision {
				delete(last, c.Key)
			}
		case <-ctx.Done():
			t.Fatalf("the last changes of %d keys did not arrive", len(last))
		}
	}
}

func watchEnds(t *testing.T, r store.Records, _ store.Blobs) {
	ctx, cancel := context.WithCancel(t.Context())
	changes, err := r.Watch(ctx)
	must(t, changes, err)
	cancel()
	select {
	case _, open := <-changes:
		if open {
			t.Error("a change came from nowhere")
		}
	case <-time.After(10 * time.Second):
		t.Error("the channel stays open")
	}
}

func blobs(t *testing.T, _ store.Records, b store.Blobs) {
	ctx := t.Context()
	for range 2 { // the second time does nothing
		if err := b.Put(ctx, "m", []byte("model")); err != nil {
			t.Fatal(err)
		}
	}
	v, err := b.Get(ctx, "m")
	if string(must(t, v, err)) != "model" {
		t.Errorf("got %q", v)
	}
	if err := b.Delete(ctx, "m"); err != nil {
		t.Fatal(err)
	}
	_, err = b.Get(ctx, "m")
	want(t, err, store.ErrMissing)
}
