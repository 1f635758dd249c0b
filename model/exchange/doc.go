// Package exchange reads models written in open formats of the trade: semidefinite programs in SDPA sparse form and
// linear programs in free MPS.
//
// Readers take nothing on trust. A declared size is held against a limit before anything is allocated for it, numbers must
// be finite, and every fault names its line. Errors are *model.FaultError.
package exchange
