package store

import (
	"context"
	"slices"
	"strings"
	"sync"
)

// Memory is a store in the memory of this process.
type Memory struct {
	mu       sync.Mutex
	revision uint64
	records  map[string]entry
	blobs    map[string][]byte
	bytes    int64 // of blobs
	limit    int64
	watchers map[*watcher]struct{}
}

type entry struct {
	value    []byte
	revision uint64
}

// blobOverhead is counted for every blob beside its bytes, so that very many small ones are bounded, too.
const blobOverhead = 256

// NewMemory returns an empty store that takes blobs of together at most limit bytes; 0 for no limit.
func NewMemory(limit int64) *Memory {
	return &Memory{records: map[string]entry{}, blobs: map[string][]byte{}, limit: limit, watchers: map[*watcher]struct{}{}}
}

// Create implements Records.
func (m *Memory) Create(_ context.Context, key string, value []byte) (uint64, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if _, ok := m.records[key]; ok {
		return 0, ErrExists
	}
	return m.set(key, value), nil
}

// set stores a copy and tells watchers.
func (m *Memory) set(key string, value []byte) uint64 {
	m.revision++
	e := entry{slices.Clone(value), m.revision}
	m.records[key] = e
	for w := range m.watchers {
		w.add(Change{key, e.value, e.revision})
	}
	return e.revision
}

// Swap implements Records.
func (m *Memory) Swap(_ context.Context, key string, value []byte, revision uint64) (uint64, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if err := m.at(key, revision); err != nil {
		return 0, err
	}
	return m.set(key, value), nil
}

func (m *Memory) at(key string, revision uint64) error {
	e, ok := m.records[key]
	switch {
	case !ok:
		return ErrMissing
	case e.revision != revision:
		return ErrChanged
	}
	return nil
}

// Get implements Records.
func (m *Memory) Get(_ context.Context, key string) ([]byte, uint64, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	e, ok := m.records[key]
	if !ok {
		return nil, 0, ErrMissing
	}
	return slices.Clone(e.value), e.revision, nil
}

// Delete implements Records.
func (m *Memory) Delete(_ context.Context, key string, revision uint64) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if err := m.at(key, revision); err != nil {
		return err
	}
	delete(m.records, key)
	m.revision++
	for w := range m.watchers {
		w.add(Change{Key: key, Revision: m.revision})
	}
	return nil
}

// Keys implements Records.
func (m *Memory) Keys(_ context.Context, prefix string) ([]string, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	var out []string
	for k := range m.records {
		if strings.HasPrefix(k, prefix) {
			out = append(out, k)
		}
	}
	slices.Sort(out)
	return out, nil
}

// Blobs returns the blobs of the store.
func (m *Memory) Blobs() Blobs { return memoryBlobs{m} }

type memoryBlobs struct{ m *Memory }

func (b memoryBlobs) Put(_ context.Context, key string, value []byte) error {
	m := b.m
	m.mu.Lock()
	defer m.mu.Unlock()
	if _, ok := m.blobs[key]; ok {
		return nil
	}
	size := int64(len(value)) + blobOverhead
	if m.limit > 0 && size > m.limit-m.bytes {
		return ErrFull
	}
	m.blobs[key] = value
	m.bytes += size
	return nil
}

func (b memoryBlobs) Get(_ context.Context, key string) ([]byte, error) {
	b.m.mu.Lock()
	defer b.m.mu.Unlock()
	v, ok := b.m.blobs[key]
	if !ok {
		return nil, ErrMissing
	}
	return v, nil
}

func (b memoryBlobs) Delete(_ context.Context, key string) error {
	b.m.mu.Lock()
	defer b.m.mu.Unlock()
	if v, ok := b.m.blobs[key]; ok {
		b.m.bytes -= int64(len(v)) + blobOverhead
		delete(b.m.blobs, key)
	}
	return nil
}

// Watch implements Records.
func (m *Memory) Watch(ctx context.Context) (<-chan Change, error) {
	w := &watcher{wake: make(chan struct{}, 1), latest: map[string]Change{}}
	m.mu.Lock()
	m.watchers[w] = struct{}{}
	m.mu.Unlock()
	out := make(chan Change)
	go func() {
		defer close(out)
		defer func() {
			m.mu.Lock()
			delete(m.watchers, w)
			m.mu.Unlock()
		}()
		for {
			for _, c := range w.take() {
				select {
				case out <- c:
				case <-ctx.Done():
					return
				}
			}
			select {
			case <-w.wake:
			case <-ctx.Done():
				return
			}
		}
	}()
	return out, nil
}

// watcher gathers changes for one reader, the latest by key.
type watcher struct {
	mu     sync.Mutex
	latest map[string]Change
	wake   chan struct{}
}

func (w *watcher) add(c Change) {
	w.mu.Lock()
	w.latest[c.Key] = c
	w.mu.Unlock()
	select {
	case w.wake <- struct{}{}:
	default:
	}
}

// take empties the watcher, changes in order of revision.
func (w *watcher) take() []Change {
	w.mu.Lock()
	defer w.mu.Unlock()
	var out []Change
	for _, c := range w.latest {
		out = append(out, c)
	}
	clear(w.latest)
	slices.SortFunc(out, func(a, b Change) int {
		if a.Revision < b.Revision {
			return -1
		}
		return 1
	})
	return out
}
