// Command towpathd serves the Towpath solver broker over gRPC.
package main

import (
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"

	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
)

func main() {
	signals := make(chan os.Signal, 2) // one to drain, one to end at once
	signal.Notify(signals, syscall.SIGTERM, os.Interrupt)
	os.Exit(run(os.Args[1:], os.LookupEnv, signals, os.Stdout, os.Stderr))
}

// Exit codes.
const (
	exitServed = 0 // until it was asked to stop
	exitFailed = 1 // wrong settings, or it could not serve
	exitForced = 2 // a second signal came while it drained
)

// run is main without the process.
func run(args []string, lookup func(string) (string, bool), signals <-chan os.Signal, out, err io.Writer) int {
	s, failure := parseSettings(args, lookup)
	if errors.Is(failure, flag.ErrHelp) {
		writeHelp(out)
		return exitServed
	}
	if failure != nil {
		fmt.Fprintf(err, "towpathd: %v\n", failure)
		return exitFailed
	}
	log := newLog(s.logLevel, err)
	failure = serve(s, signals, log)
	_ = log.Sync() // standard error often cannot be synchronized, and there is nobody left to tell
	switch {
	case errors.Is(failure, errForced):
		return exitForced
	case failure != nil:
		return exitFailed
	}
	return exitServed
}

// newLog returns a logger of JSON lines. It does not sample: no decision may be missing.
func newLog(level zapcore.Level, w io.Writer) *zap.Logger {
	c := zap.NewProductionEncoderConfig()
	c.TimeKey, c.EncodeTime = "time", zapcore.RFC3339NanoTimeEncoder
	return zap.New(zapcore.NewCore(zapcore.NewJSONEncoder(c), zapcore.Lock(zapcore.AddSync(w)), level))
}
