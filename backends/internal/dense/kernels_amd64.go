package dense

import "golang.org/x/sys/cpu"

// kernels lists what this processor can run, the fastest first.
func kernels() []kernel {
	var out []kernel
	if cpu.X86.HasAVX512F && cpu.X86.HasAVX512DQ {
		out = append(out, kernel{"AVX-512", 4, 16, tileAVX512})
	}
	if cpu.X86.HasAVX2 && cpu.X86.HasFMA {
		out = append(out, kernel{"AVX2", 4, 4, tileAVX2})
	}
	return out
}
