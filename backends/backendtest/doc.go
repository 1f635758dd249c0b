// Package backendtest holds the suite that every driver passes: what package backends promises of a driver, tried on
// the published instances, on random models built from their answer, and under withdrawal, limits and company.
package backendtest
