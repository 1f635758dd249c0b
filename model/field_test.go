package model_test

import (
	"testing"

	"towpath/model"
)

// The order 3 by hand, as the package comment lists it.
func TestPackedOrderOfEntriesByHand(t *testing.T) {
	for k, at := range [][2]int{{0, 0}, {1, 0}, {2, 0}, {1, 1}, {2, 1}, {2, 2}} {
		if got := model.PackedIndex(3, at[0], at[1]); got != k {
			t.Errorf("row %d, column %d is at %d, want %d", at[0], at[1], got, k)
		}
	}
}

// Column by column the lower triangle takes the positions 0, 1, 2, ..., and PackedAt finds the way back.
func TestPackedPositions(t *testing.T) {
	for order := 1; order <= 60; order++ {
		k := 0
		for j := range order {
			for i := j; i < order; i++ {
				if got := model.PackedIndex(order, i, j); got != k {
					t.Fatalf("order %d: row %d, column %d is at %d, want %d", order, i, j, got, k)
				}
				if gi, gj := model.PackedAt(order, k); gi != i || gj != j {
					t.Fatalf("order %d: position %d is row %d, column %d, want %d, %d", order, k, gi, gj, i, j)
				}
				k++
			}
		}
		if got := model.PackedLen(order); got != k {
			t.Errorf("order %d: packed length %d, want %d", order, got, k)
		}
	}
}

// In big orders: both ends of a column, and the steps from one column to the next, over columns near both ends and
// throughout the middle.
func TestPackedPositionsOfBigOrders(t *testing.T) {
	for _, order := range []int{1000, 4095, 4096, 65536, model.MaxOrder, 1 << 30} {
		try := func(k, i, j int) {
			t.Helper()
			if got := model.PackedIndex(order, i, j); got != k {
				t.Fatalf("order %d: row %d, column %d is at %d, want %d", order, i, j, got, k)
			}
			if gi, gj := model.PackedAt(order, k); gi != i || gj != j {
				t.Fatalf("order %d: position %d is row %d, column %d, want %d, %d", order, k, gi, gj, i, j)
			}
		}
		for j := 0; j < order; j += 1 + order/997 {
			start := j*order - (j*j-j)/2 // columns before it have order, order-1, ... entries
			try(start, j, j)
			try(start+order-1-j, order-1, j)
			if j > 0 {
				try(start-1, order-1, j-1)
			}
		}
		last := order*(order+1)/2 - 1
		try(last, order-1, order-1)
		try(last-1, order-1, order-2)
		try(last-2, order-2, order-2)
	}
}

// PackedOrder undoes PackedLen, and knows the lengths that are none: a length between two neighbours has no order.
func TestPackedOrder(t *testing.T) {
	next := 0 // the smallest order whose length is not below n
	for n := range model.PackedLen(60) + 1 {
		if n > next*(next+1)/2 {
			next++
		}
		order, ok := model.PackedOrder(n)
		if want := n == next*(next+1)/2; ok != want || ok && order != next {
			t.Fatalf("%d entries: order %d, %v; want %d, %v", n, order, ok, next, want)
		}
	}
	for _, order := range []int{1000, 65535, 65536, model.MaxOrder, 1<<30 - 1, 1 << 30} {
		n := order * (order + 1) / 2
		if got, ok := model.PackedOrder(n); !ok || got != order {
			t.Errorf("%d entries: order %d, %v; want %d", n, got, ok, order)
		}
		for _, off := range []int{-1, 1} {
			if got, ok := model.PackedOrder(n + off); ok {
				t.Errorf("%d entries are said to be a matrix of order %d", n+off, got)
			}
		}
	}
	for _, n := range []int{-1, -3, -1 << 63} {
		if _, ok := model.PackedOrder(n); ok {
			t.Errorf("%d entries are said to be a matrix", n)
		}
	}
}

// The largest order of a model is the largest whose entries have 32-bit columns.
func TestMaxOrder(t *testing.T) {
	if n := model.PackedLen(model.MaxOrder); n > model.MaxEntries {
		t.Errorf("order %d has %d entries", model.MaxOrder, n)
	}
	if n := model.PackedLen(model.MaxOrder + 1); n <= model.MaxEntries {
		t.Errorf("order %d has only %d entries", model.MaxOrder+1, n)
	}
}
