package main

import (
	"fmt"
	"math"
	"strings"
	"time"

	towpathv1 "towpath/proto/towpath/v1"

	"google.golang.org/protobuf/reflect/protoreflect"
)

// word turns an enum value of the wire contract into the word used everywhere else: OUTCOME_OPTIMAL is "optimal".
func word(e protoreflect.Enum, prefix string) string {
	v := e.Descriptor().Values().ByNumber(e.Number())
	if v == nil {
		return fmt.Sprintf("unknown (%d)", e.Number())
	}
	return strings.ReplaceAll(strings.ToLower(strings.TrimPrefix(string(v.Name()), prefix)), "_", " ")
}

func outcomeWord(o towpathv1.Outcome) string     { return word(o, "OUTCOME_") }
func verdictWord(v towpathv1.Verdict) string     { return word(v, "VERDICT_") }
func stateWord(s towpathv1.JobState) string      { return word(s, "JOB_STATE_") }
func fieldWord(f towpathv1.Field) string         { return word(f, "FIELD_") }
func exactnessWord(e towpathv1.Exactness) string { return word(e, "EXACTNESS_") }

// shownDigits is what people compare at a glance; fullDigits, for --values and --multipliers, tells numbers apart that
// differ by little more than rounding.
const (
	shownDigits = 6
	fullDigits  = 16
)

func numberText(z complex128, digits int) string {
	re, im := real(z), imag(z)
	if im == 0 {
		return fmt.Sprintf("%.*g", digits, re)
	}
	return fmt.Sprintf("%.*g%+.*gi", digits, re, digits, im)
}

// residualText shows a residual: its size matters, not its digits.
func residualText(x *float64) string {
	if x == nil {
		return "-"
	}
	return fmt.Sprintf("%.1e", *x)
}

func valueText(x *float64) string {
	if x == nil || math.IsNaN(*x) {
		return "-"
	}
	return fmt.Sprintf("%.10g", *x)
}

// secondsText rounds a time to about what one run can tell.
func secondsText(s float64) string {
	switch {
	case math.IsNaN(s):
		return "-"
	case s >= 99.5:
		return time.Duration(s * float64(time.Second)).Round(time.Second).String()
	case s >= 1:
		return fmt.Sprintf("%.3g s", s)
	case s >= 1e-3:
		return fmt.Sprintf("%.3g ms", s*1e3)
	}
	return fmt.Sprintf("%.3g us", s*1e6)
}
