package csdp

import (
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// sdpaFile is an SDPA sparse file as a reader of its own understands it: full matrices, number 0 being C.
type sdpaFile struct {
	a        []float64
	sizes    []int           // negative for diagonals
	matrices [][][][]float64 // matrix, block, row, column
}

var plainNumber = regexp.MustCompile(`^-?\d(\.\d+)?(e[+-]\d{2,3})?$|^-?\d+(\.\d+)?$`)

// readSDPAFile reads a file by the strictest rules of all programs that read this format, and fails the test where one is
// broken: upper triangle only, entries once, from 1 on, no zeros, at most 17 digits and no exponents with D, nothing that
// is not finite, no empty A_i, diagonal blocks of negative size with diagonal entries only.
func readSDPAFile(t *testing.T, text string) *sdpaFile {
	t.Helper()
	if !strings.HasSuffix(text, "\n") {
		t.Fatalf("the last line does not end:\n%s", text)
	}
	lines := strings.Split(strings.TrimSuffix(text, "\n"), "\n")
	if len(lines) < 4 {
		t.Fatalf("%d lines:\n%s", len(lines), text)
	}
	m, blocks := count(t, lines[0]), count(t, lines[1])
	f := &sdpaFile{}
	for _, w := range strings.Fields(lines[2]) {
		n := count(t, w)
		if n == 0 {
			t.Errorf("a block of size %s", w)
		}
		f.sizes = append(f.sizes, n)
	}
	for _, w := range strings.Fields(lines[3]) {
		f.a = append(f.a, decimal(t, w))
	}
	if m < 1 || blocks < 1 || len(f.a) != m || len(f.sizes) != blocks {
		t.Fatalf("%d rows with %d numbers, %d blocks with %d sizes", m, len(f.a), blocks, len(f.sizes))
	}
	for range m + 1 {
		var of [][][]float64
		for _, n := range f.sizes {
			n = max(n, -n)
			square := make([][]float64, n)
			for i := range square {
				square[i] = make([]float64, n)
			}
			of = append(of, square)
		}
		f.matrices = append(f.matrices, of)
	}
	filled := make([]bool, m+1)
	filled[0] = true // C may be zero
	for _, line := range lines[4:] {
		w := strings.Fields(line)
		if len(w) != 5 {
			t.Fatalf("line %q has %d fields", line, len(w))
		}
		of, k, i, j, v := count(t, w[0]), count(t, w[1]), count(t, w[2]), count(t, w[3]), decimal(t, w[4])
		if of < 0 || of > m || k < 1 || k > blocks {
			t.Fatalf("line %q: no such matrix or block", line)
		}
		n := f.sizes[k-1]
		switch {
		case i < 1 || j < 1 || max(i, j) > max(n, -n):
			t.Fatalf("line %q is outside its block of size %d", line, n)
		case i > j:
			t.Errorf("line %q is in the lower triangle", line)
		case n < 0 && i != j:
			t.Errorf("line %q is off the diagonal of a diagonal block", line)
		case v == 0:
			t.Errorf("line %q is a zero", line)
		case f.matrices[of][k-1][i-1][j-1] != 0:
			t.Errorf("line %q comes again", line)
		}
		f.matrices[of][k-1][i-1][j-1], f.matrices[of][k-1][j-1][i-1] = v, v
		filled[of] = true
	}
	for i, ok := range filled {
		if !ok {
			t.Errorf("A_%d is empty", i)
		}
	}
	return f
}

func count(t *testing.T, w string) int {
	t.Helper()
	n, err := strconv.Atoi(w)
	if err != nil {
		t.Fatal(err)
	}
	return n
}

func decimal(t *testing.T, w string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(w, 64)
	digits, _, _ := strings.Cut(w, "e")
	digits = strings.NewReplacer("-", "", ".", "").Replace(digits)
	if err != nil || math.IsNaN(v-v) || !plainNumber.MatchString(w) || len(strings.TrimLeft(digits, "0")) > 17 {
		t.Fatalf("%q is not a plain finite number of at most 17 digits (%v)", w, err)
	}
	return v
}

// product is tr(M X) over full matrices, and the sum of the sizes of its terms.
func product(m, x [][][]float64) (v, size float64) {
	for k := range m {
		for i := range m[k] {
			for j, c := range m[k][i] {
				v += c * x[k][i][j]
				size += math.Abs(c * x[k][i][j])
			}
		}
	}
	return v, size
}
