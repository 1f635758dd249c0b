package main

import (
	"towpath/backends"
	"towpath/backends/csdp"
	"towpath/backends/interior"
	service "towpath/broker"

	"go.uber.org/zap"
)

// connect reaches the broker at an address, or starts one inside this process when the address is empty. The embedded one
// is reached over gRPC, too.
func connect(address string, _ streams) (*broker, error) {
	if address != "" {
		return dial(address)
	}
	drivers := []backends.Driver{interior.New()}
	var absent []service.Absent
	if path, ok := csdp.Find(); ok {
		drivers = append(drivers, csdp.New(path))
	} else {
		absent = append(absent, service.Absent{Backend: "csdp", Cure: "install the Debian package " + csdp.Package})
	}
	b, err := service.New(service.Config{}, drivers, absent, zap.NewNop())
	if err != nil {
		return nil, err
	}
	conn, closeAll, err := service.NewServer(b).Embed()
	if err != nil {
		return nil, err
	}
	return newBroker(conn, closeAll), nil
}
