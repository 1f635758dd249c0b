// Command towpathd serves Towpath over gRPC.
package main

import (
	"errors"
	"flag"
	"fmt"
	"net"
	"os"
	"os/signal"
	"syscall"

	"towpath/backends"
	"towpath/backends/csdp"
	"towpath/backends/interior"
	"towpath/broker"

	"go.uber.org/zap"
)

func main() {
	s, err := parseSettings(os.Args[1:], environment)
	if errors.Is(err, flag.ErrHelp) {
		writeHelp(os.Stdout)
		return
	}
	if err == nil {
		err = serve(s)
	}
	if err != nil {
		fmt.Fprintf(os.Stderr, "towpathd: %v\n", err)
		os.Exit(1)
	}
}

// serve runs the broker until SIGTERM or SIGINT, then drains it.
func serve(s *settings) error {
	c := zap.NewProductionConfig()
	c.Level = zap.NewAtomicLevelAt(s.logLevel)
	c.Sampling = nil // no decision may be missing from the log
	log, err := c.Build()
	if err != nil {
		return err
	}
	drivers := []backends.Driver{interior.New()}
	var absent []broker.Absent
	if path, ok := csdp.Find(); ok {
		drivers = append(drivers, csdp.New(path))
	} else {
		absent = append(absent, broker.Absent{Backend: "csdp", Cure: "install the Debian package " + csdp.Package})
	}
	b, err := broker.New(broker.Config{
		Workers: s.workers, QueueLimit: s.queue, RunLimit: s.runLimit, LifeLimit: s.lifeLimit,
		MemoryLimit: uint64(s.memoryLimit), Grace: s.drain,
	}, drivers, absent, log)
	if err != nil {
		return err
	}
	l, err := net.Listen("tcp", s.listen)
	if err != nil {
		b.Stop()
		return err
	}
	server := broker.NewServer(b)
	log.Info("serving", zap.String("address", l.Addr().String()))
	signals := make(chan os.Signal, 1)
	signal.Notify(signals, syscall.SIGTERM, os.Interrupt)
	stopped := make(chan struct{})
	go func() {
		<-signals
		server.Stop()
		close(stopped)
	}()
	if err := server.Serve(l); err != nil {
		return err
	}
	<-stopped
	return nil
}
