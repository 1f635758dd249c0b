// Package modeltest has models with known answers, for tests: published and closed-form instances, and random models
// that are built from their answer.
//
// The files in testdata were made for this project; each case carries its source, and whether the source was read or is
// from memory.
package modeltest
