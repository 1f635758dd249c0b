//go:build !amd64

package dense

// kernels lists none: only amd64 has assembly kernels.
func kernels() []kernel { return nil }
