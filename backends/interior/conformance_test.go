package interior

import (
	"testing"

	"towpath/backends/backendtest"
)

func TestConformance(t *testing.T) {
	backendtest.Run(t, New(), backendtest.Expect{Instances: 0.98, Random: 0.96, Spread: 2, Seeds: 200})
}
