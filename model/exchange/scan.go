package exchange

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"towpath/model"
)

const (
	// MaxRows is the largest number of rows, packed for matrices, that a file may declare. Rows cost memory even where
	// nothing is written in them.
	MaxRows = 1 << 25
	// MaxLine is the longest line in bytes.
	MaxLine = 1 << 26
)

// fault is an error at a line; line 0 is the file as a whole.
func fault(line int, problem, cure string) error {
	f := model.Fault{Path: "file", Place: "the file", Problem: problem, Cure: cure}
	if line > 0 {
		f.Path = fmt.Sprintf("line %d", line)
		f.Place = f.Path
	}
	return &model.FaultError{Faults: []model.Fault{f}}
}

// lines gives the lines of a file with their numbers.
type lines struct {
	in     *bufio.Scanner
	number int // of the present line, from 1
}

func newLines(r io.Reader) *lines {
	s := bufio.NewScanner(r)
	s.Buffer(nil, MaxLine)
	return &lines{in: s}
}

// next returns the next line, io.EOF after the last.
func (l *lines) next() (string, error) {
	if l.in.Scan() {
		l.number++
		return l.in.Text(), nil
	}
	switch err := l.in.Err(); {
	case err == nil:
		return "", io.EOF
	case errors.Is(err, bufio.ErrTooLong):
		return "", fault(l.number+1, fmt.Sprintf("the line is longer than %d bytes", MaxLine), "break it")
	default:
		return "", fmt.Errorf("after line %d: %w", l.number, err)
	}
}

// number reads a finite decimal number; an exponent may be written with D, as Fortran does.
func number(line int, word string) (float64, error) {
	plain := strings.Map(func(r rune) rune {
		switch {
		case r >= '0' && r <= '9', r == '+', r == '-', r == '.', r == 'e', r == 'E':
			return r
		case r == 'd' || r == 'D':
			return 'e'
		}
		return '?' // no nan, no infinity, no hexadecimal
	}, word)
	x, err := strconv.ParseFloat(plain, 64)
	switch {
	case errors.Is(err, strconv.ErrRange) && math.IsInf(x, 0):
		return 0, fault(line, fmt.Sprintf("%s is too large for a 64-bit number", clip(word)), "rescale the model")
	case err != nil && !errors.Is(err, strconv.ErrRange):
		return 0, fault(line, fmt.Sprintf("%q is not a number", clip(word)), "write finite decimal numbers")
	}
	return x, nil
}

// integer reads a whole number. Some programs write one as 3.0 or +3.
func integer(line int, word string) (int, error) {
	x, err := number(line, word)
	if err != nil {
		return 0, err
	}
	if x != math.Trunc(x) || math.Abs(x) > math.MaxInt32 {
		return 0, fault(line, fmt.Sprintf("%s is not a whole number of 32 bits", clip(word)), "write a whole number")
	}
	return int(x), nil
}

// clip shortens a word that goes into a message.
func clip(word string) string {
	const longest = 40
	if len(word) <= longest {
		return word
	}
	return strings.ToValidUTF8(word[:longest], "") + "..."
}
