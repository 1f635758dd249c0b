package store_test

import (
	"errors"
	"testing"

	"towpath/broker/store"
	"towpath/broker/store/storetest"
)

func TestMemory(t *testing.T) {
	storetest.Run(t, func(*testing.T) (store.Records, store.Blobs) {
		m := store.NewMemory(0)
		return m, m.Blobs()
	})
}

func TestMemoryIsBounded(t *testing.T) {
	b := store.NewMemory(10).Blobs()
	if err := b.Put(t.Context(), "a", make([]byte, 6)); err != nil {
		t.Fatal(err)
	}
	if err := b.Put(t.Context(), "b", make([]byte, 6)); !errors.Is(err, store.ErrFull) {
		t.Errorf("error %v, want full", err)
	}
	if err := b.Delete(t.Context(), "a"); err != nil {
		t.Fatal(err)
	}
	if err := b.Put(t.Context(), "b", make([]byte, 6)); err != nil {
		t.Errorf("room was not given back: %v", err)
	}
}
