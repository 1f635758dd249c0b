package main

import (
	service "towpath/broker"
	"towpath/cmd/internal/registry"

	"go.uber.org/zap"
)

// connect reaches the broker at an address, or starts one inside this process when the address is empty. The embedded one
// is reached over gRPC, too. It solves one job at a time, which may then use all memory, and keeps no log: what happens is
// shown.
func connect(address string) (*broker, error) {
	if address != "" {
		return dial(address)
	}
	drivers, absent := registry.Backends()
	b, err := service.New(service.Config{Workers: 1}, drivers, absent, zap.NewNop())
	if err != nil {
		return nil, err
	}
	conn, stop, err := service.NewServer(b).Embed()
	if err != nil {
		return nil, err
	}
	return newBroker(conn, stop), nil
}
