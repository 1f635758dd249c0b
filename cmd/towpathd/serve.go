package main

import (
	"errors"
	"net"
	"os"

	"towpath/broker"
	"towpath/cmd/internal/registry"

	"go.uber.org/zap"
)

// errForced says that the server ended before it had drained.
var errForced = errors.New("ended by a second signal")

// serve runs a broker until a signal comes, then drains it; at a second signal it returns at once.
func serve(s *settings, signals <-chan os.Signal, log *zap.Logger) error {
	// The address first: it is what most often is taken, and then nothing has been started.
	listener, err := net.Listen("tcp", s.listen)
	if err != nil {
		log.Error("cannot listen", zap.String("address", s.listen), zap.Error(err))
		return err
	}
	drivers, absent := registry.Backends()
	b, err := broker.New(s.config(), drivers, absent, log)
	if err != nil {
		_ = listener.Close()
		log.Error("cannot start", zap.Error(err))
		return err
	}
	server := broker.NewServer(b)
	if s.unprotected {
		log.Warn("serving without encryption and login: whoever reaches the address may use it", zap.String("address", listener.Addr().String()))
	}
	log.Info("serving", zap.String("address", listener.Addr().String()))

	ended := make(chan error, 1)
	go func() { ended <- server.Serve(listener) }()
	select {
	case err := <-ended:
		server.Stop()
		log.Error("serving ended", zap.Error(err))
		return err
	case got := <-signals:
		log.Info("asked to stop", zap.Stringer("signal", got)) // the broker logs how it drains
	}
	drained := make(chan struct{})
	go func() {
		server.Stop()
		close(drained)
	}()
	select {
	case <-drained:
		return nil
	case got := <-signals:
		log.Warn("ending at once", zap.Stringer("signal", got))
		return errForced
	}
}
