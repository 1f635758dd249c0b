package store_test

import (
	"errors"
	"fmt"
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
	b := store.NewMemory(10_000).Blobs()
	if err := b.Put(t.Context(), "a", make([]byte, 6000)); err != nil {
		t.Fatal(err)
	}
	if err := b.Put(t.Context(), "b", make([]byte, 6000)); !errors.Is(err, store.ErrFull) {
		t.Errorf("error %v, want full", err)
	}
	if err := b.Delete(t.Context(), "a"); err != nil {
		t.Fatal(err)
	}
	for range 2 { // what is not there gives no room
		if err := b.Delete(t.Context(), "a"); err != nil {
			t.Fatal(err)
		}
	}
	if err := b.Put(t.Context(), "b", make([]byte, 6000)); err != nil {
		t.Errorf("room was not given back: %v", err)
	}
	if err := b.Put(t.Context(), "c", make([]byte, 6000)); !errors.Is(err, store.ErrFull) {
		t.Errorf("error %v, want full", err)
	}
}

// Very many blobs without bytes take room, too.
func TestEmptyBlobsAreBounded(t *testing.T) {
	b := store.NewMemory(10_000).Blobs()
	var err error
	n := 0
	for ; err == nil && n < 10_000; n++ {
		err = b.Put(t.Context(), fmt.Sprint(n), nil)
	}
	if !errors.Is(err, store.ErrFull) {
		t.Errorf("%d empty blobs were taken (%v)", n, err)
	}
}
