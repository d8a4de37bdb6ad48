// Package link makes the connections of a run: gRPC over TLS 1.3 under the run's
// own authority, with the codec of package frame, bounds on everything that a
// peer can make us hold, and a pulse that tells a slow peer from a dead one.
//
// Its nouns are the Server, which listens, and the Pipe, one side of a
// bidirectional stream that carries messages. It knows nothing of what messages
// mean. A Server and a Pipe start goroutines; Stop and Wait return when they
// have ended.
package link

import (
	"context"
	"errors"
	"fmt"
	"net"
	"time"

	"google.golang.org/grpc"
	"google.golang.org/grpc/backoff"
	"google.golang.org/grpc/credentials"
	"google.golang.org/grpc/peer"

	"rowstead/proto/frame"
	"rowstead/proto/keys"
)

// Bounds and deadlines of a connection.
const (
	// HandshakeTime is how long a connection may take to be made and proven.
	HandshakeTime = 10 * time.Second
	// maxHeaderList bounds the HTTP/2 headers of a call, in bytes.
	maxHeaderList = 8 << 10
	// maxStreams bounds the calls on one connection: a party makes one.
	maxStreams = 4
	// window is how much may be on its way to a party that has not read it, in bytes:
	// a whole frame, so that none waits half-sent.
	window = 1 << 20
)

// Server listens for the calls of a run.
type Server struct {
	Address string // host:port
	server  *grpc.Server
	ended   chan struct{}
}

// Listen begins to serve on address, port 0 for any free one. register adds the
// services.
func Listen(address string, id keys.Identity, register func(grpc.ServiceRegistrar)) (*Server, error) {
	config, err := id.Server()
	if err != nil {
		return nil, fmt.Errorf("listen: %w", err)
	}
	listener, err := net.Listen("tcp", address)
	if err != nil {
		return nil, fmt.Errorf("listen: %w", err)
	}
	server := grpc.NewServer(
		grpc.Creds(gathering{credentials.NewTLS(config)}), grpc.WriteBufferSize(writeBuffer),
		grpc.InitialWindowSize(window), grpc.InitialConnWindowSize(window),
		grpc.ForceServerCodecV2(&frame.Codec{}),
		grpc.MaxRecvMsgSize(frame.MaxBytes), grpc.MaxSendMsgSize(frame.MaxBytes),
		grpc.MaxHeaderListSize(maxHeaderList), grpc.MaxConcurrentStreams(maxStreams),
		grpc.ConnectionTimeout(HandshakeTime), grpc.WaitForHandlers(true),
	)
	register(server)
	s := &Server{Address: listener.Addr().String(), server: server, ended: make(chan struct{})}
	go func() {
		defer close(s.ended)
		server.Serve(listener) // ends with Stop; a listener that fails leaves calls without answer, which Await notices
	}()
	return s, nil
}

// Stop closes all connections and waits for the handlers of their calls.
func (s *Server) Stop() {
	s.server.Stop()
	<-s.ended
}

// Dial prepares a connection to the party of that name at address; it is made
// with the first call.
func Dial(address, name string, id keys.Identity) (*grpc.ClientConn, error) {
	config, err := id.Client(name)
	if err != nil {
		return nil, fmt.Errorf("dial %s: %w", name, err)
	}
	codec := &frame.Codec{}
	conn, err := grpc.NewClient("passthrough:///"+address,
		grpc.WithTransportCredentials(gathering{credentials.NewTLS(config)}), grpc.WithWriteBufferSize(writeBuffer),
		grpc.WithInitialWindowSize(window), grpc.WithInitialConnWindowSize(window),
		grpc.WithDefaultCallOptions(grpc.ForceCodecV2(codec), grpc.MaxCallRecvMsgSize(frame.MaxBytes), grpc.MaxCallSendMsgSize(frame.MaxBytes)),
		grpc.WithMaxHeaderListSize(maxHeaderList),
		grpc.WithConnectParams(grpc.ConnectParams{Backoff: backoff.DefaultConfig, MinConnectTimeout: HandshakeTime}),
		grpc.WithNoProxy(), grpc.WithDisableServiceConfig(), grpc.WithDisableRetry(), grpc.WithDisableHealthCheck(), grpc.WithIdleTimeout(0),
	)
	if err != nil {
		return nil, fmt.Errorf("dial %s: %w", name, err)
	}
	return conn, nil
}

// PeerName is the name in the verified certificate of the party at the other end
// of a call.
func PeerName(ctx context.Context) (string, error) {
	p, found := peer.FromContext(ctx)
	if !found {
		return "", errors.New("a call without a connection")
	}
	info, secure := p.AuthInfo.(credentials.TLSInfo)
	if !secure {
		return "", errors.New("a call without TLS")
	}
	return keys.NameOf(info.State)
}
