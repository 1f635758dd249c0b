// Package capability is the capability graph: kinds of things that models ask for, sheets that say what back ends
// take, rules that say what bridges make of what, and the planner that finds the cheapest route.
//
// It knows sizes only and never touches a coefficient, so that planning costs the same for ten numbers and for
// ten million.
package capability
