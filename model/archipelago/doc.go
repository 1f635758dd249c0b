// Package archipelago holds small models of an invented place, for the demo, the tests and the documentation.
//
// The Ormeray isles lie far out. A research station there runs its own power grid, a laboratory that receives single
// pulses of light from the observatory on the hill, and a coastal radar that guides the ferries in. None of it
// exists; the numbers are chosen to be plausible and the models are the ones that such a station would solve.
//
// Where the optimum is known in closed form, the case says so, names the source, and carries the expected value and
// multipliers.
//
// Nothing here is advice for a real installation. Grids and radio transmitters are operated under their operators'
// procedures and by licensed practice.
package archipelago
