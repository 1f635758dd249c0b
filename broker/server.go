package broker

import (
	"context"
	"net"
	"runtime/debug"
	"time"

	towpathv1 "towpath/proto/towpath/v1"

	"go.uber.org/zap"
	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/credentials/insecure"
	"google.golang.org/grpc/health"
	"google.golang.org/grpc/health/grpc_health_v1"
	"google.golang.org/grpc/keepalive"
	"google.golang.org/grpc/reflection"
	"google.golang.org/grpc/status"
	"google.golang.org/grpc/test/bufconn"
)

// Server serves a broker over gRPC, with the standard health service and reflection.
type Server struct {
	broker *Broker
	grpc   *grpc.Server
	health *health.Server
}

// Keepalive: clients may ask every 20 s, not more often; idle connections are asked after a minute.
const (
	leastPing   = 20 * time.Second
	pingAfter   = time.Minute
	pingTimeout = 20 * time.Second
	// concurrentCalls bounds the calls on one connection: watching is cheap, so it is generous.
	concurrentCalls = 1000
	// closing bounds how long open calls may take to end when the server stops.
	closing = 5 * time.Second
)

// NewServer assembles the services of a broker. Messages keep gRPC's limit of 4 MiB: larger models come in chunks.
func NewServer(b *Broker) *Server {
	s := &Server{broker: b, health: health.NewServer()}
	s.grpc = grpc.NewServer(
		grpc.KeepaliveEnforcementPolicy(keepalive.EnforcementPolicy{MinTime: leastPing}),
		grpc.MaxConcurrentStreams(concurrentCalls),
		grpc.KeepaliveParams(keepalive.ServerParameters{Time: pingAfter, Timeout: pingTimeout}),
		grpc.ChainUnaryInterceptor(s.settleUnary),
		grpc.ChainStreamInterceptor(s.settleStream),
	)
	towpathv1.RegisterJobServiceServer(s.grpc, &jobService{b: b})
	towpathv1.RegisterRouteServiceServer(s.grpc, &routeService{b: b})
	grpc_health_v1.RegisterHealthServer(s.grpc, s.health)
	for name := range s.grpc.GetServiceInfo() {
		s.health.SetServingStatus(name, grpc_health_v1.HealthCheckResponse_SERVING)
	}
	reflection.Register(s.grpc)
	return s
}

// Serve answers on the listener until Stop.
func (s *Server) Serve(l net.Listener) error { return s.grpc.Serve(l) }

// Stop drains: health says NOT_SERVING, the broker drains, calls get a while to end. It may be called more than once.
func (s *Server) Stop() {
	s.health.Shutdown()
	s.broker.Stop()
	hard := time.AfterFunc(closing, s.grpc.Stop)
	defer hard.Stop()
	s.grpc.GracefulStop()
}

// settled turns whatever a handler ended with into what goes out, panics too: one request must not end the others.
func (s *Server) settled(method string, err *error) {
	if x := recover(); x != nil {
		*err = s.broker.panicked(method, x)
	}
	*err = statusOf(*err)
	if status.Code(*err) == codes.Internal {
		s.broker.log.Error("call failed", zap.String("method", method), zap.Error(*err))
	}
}

func (s *Server) settleUnary(ctx context.Context, q any, info *grpc.UnaryServerInfo, handle grpc.UnaryHandler) (out any, err error) {
	defer s.settled(info.FullMethod, &err)
	return handle(ctx, q)
}

func (s *Server) settleStream(srv any, stream grpc.ServerStream, info *grpc.StreamServerInfo, handle grpc.StreamHandler) (err error) {
	defer s.settled(info.FullMethod, &err)
	return handle(srv, stream)
}

// panicked logs a panic and returns what a client is told of it.
func (b *Broker) panicked(where string, x any) error {
	b.log.Error("panic contained", zap.String("where", where), zap.Any("panic", x), zap.ByteString("stack", debug.Stack()))
	return refuse(codes.Internal, Internal, "internal fault; it is in the server's log, please report it")
}

// Embed serves the broker inside this process and returns a connection to it, real gRPC without a network. close stops
// both.
func (s *Server) Embed() (conn *grpc.ClientConn, close func(), err error) {
	const buffer = 1 << 20
	l := bufconn.Listen(buffer)
	go func() { _ = s.Serve(l) }() // ends with Stop, with nothing to say
	conn, err = grpc.NewClient("passthrough:embedded",
		grpc.WithContextDialer(func(ctx context.Context, _ string) (net.Conn, error) { return l.DialContext(ctx) }),
		grpc.WithTransportCredentials(insecure.NewCredentials()))
	if err != nil {
		s.Stop()
		return nil, nil, err
	}
	return conn, func() {
		_ = conn.Close()
		s.Stop()
	}, nil
}
