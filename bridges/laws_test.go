package bridges_test

import (
	"testing"

	"towpath/bridges"
	"towpath/bridges/bridgetest"
)

func TestLaws(t *testing.T) {
	bridgetest.Run(t, bridges.All())
}
