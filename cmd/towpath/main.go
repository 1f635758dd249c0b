// Command towpath sends optimization models to a Towpath broker and shows what comes back. Without an address it runs
// a broker of its own inside the process and talks to it through real gRPC.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	code := run(ctx, os.Args[1:], streams{in: os.Stdin, out: os.Stdout, err: os.Stderr, live: isTerminal(os.Stderr)})
	stop()
	os.Exit(code)
}

// isTerminal reports whether people watch the file as it is written.
func isTerminal(f *os.File) bool {
	info, err := f.Stat()
	return err == nil && info.Mode()&os.ModeCharDevice != 0
}
