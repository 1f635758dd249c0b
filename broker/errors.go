package broker

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"towpath/broker/store"
	"towpath/broker/wire"
	"towpath/model"

	"google.golang.org/genproto/googleapis/rpc/errdetails"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"
	"google.golang.org/protobuf/protoadapt"
	"google.golang.org/protobuf/types/known/durationpb"
)

// Reason is a stable word for programs: what went wrong.
type Reason string

// All reasons, of refused calls and of ended jobs.
const (
	ModelInvalid     Reason = "MODEL_INVALID"      // the model has faults
	RequestInvalid   Reason = "REQUEST_INVALID"    // the request has
	UploadBroken     Reason = "UPLOAD_BROKEN"      // a stream does not follow the contract
	ModelTooLarge    Reason = "MODEL_TOO_LARGE"    // over a limit of this server
	NoRoute          Reason = "NO_ROUTE"           // no back end can take the model
	UnknownSheet     Reason = "UNKNOWN_SHEET"      // the job names a sheet or back end that is not there
	UnknownJob       Reason = "UNKNOWN_JOB"        // no such job, or no longer
	UnknownModel     Reason = "UNKNOWN_MODEL"      // no such uploaded model, or no longer
	NoAnswer         Reason = "NO_ANSWER"          // the job has no answer
	RequestIDReused  Reason = "REQUEST_ID_REUSED"  // the same request_id with another request
	QueueFull        Reason = "QUEUE_FULL"         // too many jobs wait
	StoreFull        Reason = "STORE_FULL"         // no room for the model
	Draining         Reason = "DRAINING"           // the server is stopping: try another, or later
	Drained          Reason = "DRAINED"            // the server stopped before there was an answer
	BackendFailed    Reason = "BACKEND_FAILED"     // no back end could run
	RunLimitReached  Reason = "RUN_LIMIT_REACHED"  // of the solve
	LifeLimitReached Reason = "LIFE_LIMIT_REACHED" // of the job
	Withdrawn        Reason = "WITHDRAWN"          // by a client
	Internal         Reason = "INTERNAL"           // a bug of ours
)

// domain names this service in error details.
const domain = "towpath"

// refusal is an error with all that a client is told of it.
type refusal struct {
	code   codes.Code
	reason Reason
	text   string
	faults []model.Fault
	retry  time.Duration // 0: do not
}

func (r *refusal) Error() string { return r.text }

func refuse(code codes.Code, reason Reason, format string, a ...any) *refusal {
	return &refusal{code: code, reason: reason, text: fmt.Sprintf(format, a...)}
}

// Errors travel in HTTP/2 trailers, which many peers limit to 8 KiB, details in base64. What does not fit is left out.
const (
	shownFaults = 20
	shownBytes  = 3 << 10 // of violations
	shownText   = 2 << 10 // bytes of a message; also of a fault kept with a job
)

// clip makes text from anywhere fit for messages: valid UTF-8 of bounded length.
func clip(text string) string {
	text = strings.ToValidUTF8(text, "?")
	if len(text) <= shownText {
		return text
	}
	return strings.ToValidUTF8(text[:shownText], "") + "..."
}

// listed gives the faults one per line, as many as fit, and how many more there are.
func listed(e *model.FaultError) string {
	text := ""
	for k, f := range e.Faults {
		line := clip(f.String())
		if k > 0 && len(text)+len(line) > shownText-100 {
			return text + fmt.Sprintf("\nand %d more faults", len(e.Faults)-k+e.More)
		}
		if k > 0 {
			text += "\n"
		}
		text += line
	}
	if e.More > 0 {
		text += fmt.Sprintf("\nand %d more faults", e.More)
	}
	return text
}

// GRPCStatus makes the status that goes out: ErrorInfo always, BadRequest for faults, RetryInfo where a retry makes sense.
func (r *refusal) GRPCStatus() *status.Status {
	details := []protoadapt.MessageV1{&errdetails.ErrorInfo{Reason: string(r.reason), Domain: domain}}
	if len(r.faults) > 0 {
		bad := &errdetails.BadRequest{}
		bytes := 0
		for _, f := range r.faults[:min(len(r.faults), shownFaults)] {
			if bytes += len(f.Path) + len(f.String()); bytes > shownBytes && len(bad.FieldViolations) > 0 {
				break
			}
			bad.FieldViolations = append(bad.FieldViolations, &errdetails.BadRequest_FieldViolation{Field: f.Path, Description: clip(f.String())})
		}
		details = append(details, bad)
	}
	if r.retry > 0 {
		details = append(details, &errdetails.RetryInfo{RetryDelay: durationpb.New(r.retry)})
	}
	s := status.New(r.code, clip(r.text))
	if with, err := s.WithDetails(details...); err == nil {
		return with
	}
	return s
}

// statusOf turns any error into what goes out. Codes are chosen here and nowhere else.
func statusOf(err error) error {
	var r *refusal
	var faults *model.FaultError
	var large *wire.TooLargeError
	var stream *wire.StreamError
	switch {
	case err == nil:
		return nil
	case errors.As(err, &r):
		return r.GRPCStatus().Err()
	case errors.As(err, &faults):
		return (&refusal{code: codes.InvalidArgument, reason: ModelInvalid, text: listed(faults), faults: faults.Faults}).GRPCStatus().Err()
	case errors.As(err, &stream):
		return (&refusal{code: codes.InvalidArgument, reason: UploadBroken, text: stream.Error(), faults: []model.Fault{stream.Fault}}).GRPCStatus().Err()
	case errors.As(err, &large):
		return refuse(codes.ResourceExhausted, ModelTooLarge, "%v", large).GRPCStatus().Err()
	case errors.Is(err, store.ErrFull):
		full := refuse(codes.ResourceExhausted, StoreFull, "there is no room for another model or answer; try later")
		full.retry = 30 * time.Second
		return full.GRPCStatus().Err()
	case errors.Is(err, context.Canceled):
		return status.Error(codes.Canceled, "the caller went away")
	case errors.Is(err, context.DeadlineExceeded):
		return status.Error(codes.DeadlineExceeded, "the caller's deadline passed; the job goes on")
	}
	if s, ok := status.FromError(err); ok {
		return s.Err()
	}
	return refuse(codes.Internal, Internal, "internal fault: %v", err).GRPCStatus().Err()
}
