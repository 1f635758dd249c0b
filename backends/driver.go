// Package backends holds the contract between the broker and solvers; each folder below it is one driver.
package backends

import (
	"context"
	"time"

	"towpath/capability"
	"towpath/model"
)

// Driver runs one back end.
//
// It is handed models that its sheet takes natively, always minimizations, and answers in their terms. It does not
// rewrite, rescale beyond its own numerics, retry or grade itself: the broker examines every answer.
type Driver interface {
	// Sheets lists what the back end takes, at least one.
	Sheets() []capability.Sheet
	// Solve solves the model under the named sheet. Infeasible, unbounded, stopped and inaccurate are outcomes, not
	// errors: an error means that the back end could not run. When ctx ends, Solve returns within one iteration
	// (in-process) or after killing the child's process group, with outcome Stopped and the best point so far if any.
	// The model is not modified.
	Solve(ctx context.Context, sheet string, m *model.Model, o Options) (*model.Answer, error)
}

// Options of one solve.
type Options struct {
	// Tolerance on relative gap and relative residuals; 0 means the back end's own default.
	Tolerance float64
	// MaxIterations; 0 means the back end's own default.
	MaxIterations int
	// MaxMemory of the solve in bytes; 0 means no limit.
	MaxMemory int64
	// Progress is called from the solving goroutine after every iteration, if not nil. It must return quickly.
	Progress func(Progress)
}

// Progress of a running solve. Residuals are relative.
type Progress struct {
	Iteration      int
	Primal, Dual   float64 // objectives
	Gap            float64
	PrimalResidual float64
	DualResidual   float64
	Step           float64
	Elapsed        time.Duration
}
