// Package registry lists the back ends that both commands offer.
package registry

import (
	"towpath/backends"
	"towpath/backends/csdp"
	"towpath/backends/glpk"
	"towpath/backends/interior"
	"towpath/broker"
)

// Backends returns the drivers of all back ends that are here, and those that this machine could have but has not. To
// add a back end, add it to one of the two lists.
func Backends() (drivers []backends.Driver, absent []broker.Absent) {
	drivers = []backends.Driver{
		interior.New(),
	}
	for _, p := range []program{
		{"csdp", csdp.Package, csdp.Find, func(path string) backends.Driver { return csdp.New(path) }},
		{"glpk", glpk.Package, glpk.Find, func(path string) backends.Driver { return glpk.New(path) }},
	} {
		if path, ok := p.find(); ok {
			drivers = append(drivers, p.open(path))
		} else {
			absent = append(absent, broker.Absent{Backend: p.name, Cure: "install the Debian package " + p.debian})
		}
	}
	return drivers, absent
}

// program is a back end that runs an installed program.
type program struct {
	name   string
	debian string // the package that has it
	find   func() (path string, ok bool)
	open   func(path string) backends.Driver
}
