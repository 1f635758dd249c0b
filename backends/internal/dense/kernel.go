package dense

// kernel multiplies packed panels: c = sum over k steps of a[k] b[k]^T, complex, a of some rows, b of some columns. In each
// step a has the real parts of its rows, then the imaginary parts; so has b of its columns. c has for each row the real
// parts of its columns, then the imaginary parts.
type kernel struct {
	name          string
	rows, columns int
	tile          func(k int, a, b, c *float64)
}

//go:generate go -C generate run . -out ../kernel_amd64.s -stubs ../kernel_amd64.go -pkg dense

// fastest is the kernel that this processor runs, nil when plain Go has to do.
var fastest = func() *kernel {
	if all := kernels(); len(all) > 0 {
		return &all[0]
	}
	return nil
}()

// leastOrder is the order from which packing pays.
const leastOrder = 8

// Accelerated reports whether products run on an assembly kernel.
func Accelerated() bool { return fastest != nil }
