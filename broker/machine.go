package broker

import (
	"bytes"
	"os"
	"strconv"
)

// machineMemory returns the bytes of memory that this process can count on: the machine's, or those of its control group
// (Linux cgroup v2) when fewer. Where neither can be read it is a cautious guess.
func machineMemory() uint64 {
	const guess = 4 << 30
	total := uint64(guess)
	if text, err := os.ReadFile("/proc/meminfo"); err == nil {
		total = memTotal(text, guess)
	}
	if text, err := os.ReadFile("/sys/fs/cgroup/memory.max"); err == nil {
		if n, err := strconv.ParseUint(string(bytes.TrimSpace(text)), 10, 64); err == nil { // "max" when there is no limit
			total = min(total, n)
		}
	}
	return total
}

// memTotal reads the line "MemTotal: n kB" of /proc/meminfo.
func memTotal(text []byte, otherwise uint64) uint64 {
	for line := range bytes.Lines(text) {
		f := bytes.Fields(line)
		if len(f) == 3 && string(f[0]) == "MemTotal:" {
			if n, err := strconv.ParseUint(string(f[1]), 10, 44); err == nil {
				return n << 10
			}
		}
	}
	return otherwise
}
