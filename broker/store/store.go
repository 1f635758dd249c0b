// Package store holds what the broker must not forget, behind two narrow interfaces: records, small and changed by
// compare-and-set, and blobs, large and written once. A job is one record, the only truth about it; models and answers are
// blobs. Memory implements both for one process; a durable engine can take its place (storetest says what it owes).
package store

import (
	"context"
	"errors"
)

var (
	// ErrExists says that a key is taken.
	ErrExists = errors.New("store: the key exists")
	// ErrMissing says that there is nothing under a key.
	ErrMissing = errors.New("store: nothing under the key")
	// ErrChanged says that a record is no longer at the revision that was named.
	ErrChanged = errors.New("store: the record has changed")
	// ErrFull says that there is no room.
	ErrFull = errors.New("store: full")
)

// Change is one change of a record. Value is nil when the record was deleted.
type Change struct {
	Key      string
	Value    []byte
	Revision uint64
}

// Records are small values under keys. Revisions rise over the whole store with every change.
type Records interface {
	// Create puts a value under a new key: ErrExists when there is one.
	Create(ctx context.Context, key string, value []byte) (revision uint64, err error)
	// Swap replaces a value that is still at the revision: ErrChanged when it is not, ErrMissing when it is gone.
	Swap(ctx context.Context, key string, value []byte, revision uint64) (uint64, error)
	// Get returns a value: ErrMissing when there is none.
	Get(ctx context.Context, key string) (value []byte, revision uint64, err error)
	// Delete removes a record that is still at the revision.
	Delete(ctx context.Context, key string, revision uint64) error
	// Keys lists the keys with a prefix, sorted.
	Keys(ctx context.Context, prefix string) ([]string, error)
	// Watch sends all later changes in order, and closes the channel when ctx ends. A reader that falls behind is served
	// the latest value of each key; no key's last change is lost.
	Watch(ctx context.Context) (<-chan Change, error)
}

// Blobs are large values under keys, written once. Values must not be modified.
type Blobs interface {
	// Put stores a value: ErrFull when there is no room. Putting under a key that exists does nothing.
	Put(ctx context.Context, key string, value []byte) error
	// Get returns a value: ErrMissing when there is none.
	Get(ctx context.Context, key string) ([]byte, error)
	// Delete removes a value, if there.
	Delete(ctx context.Context, key string) error
}
