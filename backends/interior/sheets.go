package interior

import (
	"maps"

	"towpath/capability"
	"towpath/model"
)

// Names of the engine's sheets.
const (
	ComplexSheet = "interior/complex"
	RealSheet    = "interior/real"
)

// version changes when the numbers that the engine gives may change.
const version = "1"

// Sheets lists the engine's two sheets: complex to the core, and its real part alone, so that lowered routes run on any
// machine and compare with native ones on equal terms.
func (d *Driver) Sheets() []capability.Sheet {
	realOnly := map[capability.Kind]int{}
	all := map[capability.Kind]int{}
	block := func(into map[capability.Kind]int, f model.Field, c model.ConeKind) {
		into[capability.Kind{Place: capability.OnBlock, Field: f, Cone: c}] = 0
	}
	rows := func(into map[capability.Kind]int, f model.Field, c model.ConeKind) {
		into[capability.Kind{Place: capability.OnMap, Field: f, Cone: c}] = 0
	}
	block(realOnly, model.Real, model.Free)
	block(realOnly, model.Real, model.Nonneg)
	block(realOnly, model.Real, model.Lorentz)
	block(realOnly, model.Symmetric, model.PSD)
	rows(realOnly, model.Real, model.Zero)
	rows(realOnly, model.Real, model.Nonneg)
	rows(realOnly, model.Real, model.Lorentz)
	rows(realOnly, model.Symmetric, model.PSD)
	maps.Copy(all, realOnly)
	block(all, model.Complex, model.Free)
	block(all, model.Symmetric, model.Free)
	block(all, model.Hermitian, model.Free)
	block(all, model.Hermitian, model.PSD)
	rows(all, model.Complex, model.Zero)
	rows(all, model.Symmetric, model.Zero)
	rows(all, model.Hermitian, model.Zero)
	rows(all, model.Complex, model.Lorentz)
	rows(all, model.Hermitian, model.PSD)
	sheet := func(name string, takes map[capability.Kind]int) capability.Sheet {
		return capability.Sheet{Name: name, Backend: "interior", Version: version, Takes: takes, Returns: capability.LiftsAll, Accuracy: 1e-8, Toll: toll}
	}
	return []capability.Sheet{sheet(ComplexSheet, all), sheet(RealSheet, realOnly)}
}

func (d *Driver) sheet(name string) *capability.Sheet {
	for _, s := range d.Sheets() {
		if s.Name == name {
			return &s
		}
	}
	return nil
}
