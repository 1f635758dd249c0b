package glpk

import (
	"testing"

	"towpath/backends/backendtest"
)

// found returns the driver of the installed program, or skips.
func found(t *testing.T) *Driver {
	t.Helper()
	path, ok := Find()
	if !ok {
		t.Skip("glpsol is not here; install the Debian package " + Package)
	}
	return New(path)
}

func TestConformance(t *testing.T) {
	backendtest.Run(t, found(t), backendtest.Expect{Instances: 1, Random: 1, Spread: 3, NoIterations: true})
}
