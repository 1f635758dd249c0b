package interior

import (
	"context"
	"testing"

	"towpath/backends"
	"towpath/bridges"
	"towpath/bridges/bridgetest"
	"towpath/model"
)

// engine lends the complex sheet to the laws of bridges.
func engine() *bridgetest.Engine {
	d := New()
	return &bridgetest.Engine{Sheet: d.Sheets()[0], Solve: func(m *model.Model) (*model.Answer, error) {
		return d.Solve(context.Background(), ComplexSheet, m, backends.Options{})
	}}
}

func TestLawsOfBridgesInExecution(t *testing.T) { bridgetest.Run(t, bridges.All(), engine()) }

func TestMutantsOfBridgesAreCaught(t *testing.T) {
	if testing.Short() {
		t.Skip("hundreds of mutants take long")
	}
	bridgetest.TryMutants(t, engine())
}
