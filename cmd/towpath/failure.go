package main

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"google.golang.org/genproto/googleapis/rpc/errdetails"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
)

// Exit codes. They are part of the command's interface: scripts read them.
const (
	exitAnswered    = 0
	exitUsage       = 1
	exitDoubtful    = 2
	exitUnanswered  = 3
	exitUnreachable = 4
	exitInterrupted = 130 // 128 + SIGINT, the shells' custom
)

const exitCodes = `Exit codes
  0    answered, and the answer passed its examination (a certified infeasible model is answered, too)
  1    wrong options, unreadable file, invalid model or unknown job
  2    answered, but the examination found the answer doubtful or refuted it
  3    not answered: no route, job failed, withdrawn or expired
  4    the broker cannot be reached or cannot serve now
  130  interrupted
`

// failure is an error with the exit code that it asks for.
type failure struct {
	code int
	text string
}

func (f *failure) Error() string { return f.text }

func usageError(format string, a ...any) error {
	return &failure{exitUsage, fmt.Sprintf(format, a...)}
}

// quiet is a failure that has been shown already.
func quiet(code int) error { return &failure{code: code} }

// exitCode chooses the code for an error: the only place where gRPC codes become exit codes.
func exitCode(err error) int {
	var f *failure
	if errors.As(err, &f) {
		return f.code
	}
	if errors.Is(err, context.Canceled) {
		return exitInterrupted
	}
	s := reply(err)
	if s == nil {
		return exitUsage // reading a file or a model
	}
	switch s.Code() {
	case codes.InvalidArgument, codes.NotFound, codes.AlreadyExists, codes.OutOfRange:
		return exitUsage
	case codes.FailedPrecondition, codes.Aborted, codes.DeadlineExceeded, codes.ResourceExhausted:
		return exitUnanswered
	case codes.Canceled:
		return exitInterrupted
	}
	return exitUnreachable
}

// reply returns the status that a broker answered with, or nil when the error is of this process.
func reply(err error) *status.Status {
	var s interface{ GRPCStatus() *status.Status }
	if errors.As(err, &s) {
		return s.GRPCStatus()
	}
	return nil
}

// explain writes an error on one line for people: what happened, where, and what would help, where the broker says so.
func explain(err error) string {
	s := reply(err)
	if s == nil {
		return err.Error()
	}
	var text strings.Builder
	// The words in front of a wrapped status name what was being done.
	full := err.Error()
	if at := strings.Index(full, "rpc error: "); at > 0 {
		text.WriteString(full[:at])
	}
	text.WriteString(s.Message())
	for _, d := range s.Details() {
		switch d := d.(type) {
		case *errdetails.BadRequest:
			for _, v := range d.GetFieldViolations() {
				if !strings.Contains(s.Message(), v.GetDescription()) {
					fmt.Fprintf(&text, "; %s: %s", v.GetField(), v.GetDescription())
				}
			}
		case *errdetails.PreconditionFailure:
			for _, v := range d.GetViolations() {
				if !strings.Contains(s.Message(), v.GetDescription()) {
					fmt.Fprintf(&text, "; %s: %s", v.GetSubject(), v.GetDescription())
				}
			}
		case *errdetails.RetryInfo:
			fmt.Fprintf(&text, "; try again in %s", d.GetRetryDelay().AsDuration())
		}
	}
	if s.Code() == codes.Unavailable {
		text.WriteString("; is towpathd running at that address?")
	}
	return text.String()
}
