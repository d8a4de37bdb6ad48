package service

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"google.golang.org/grpc"
	"google.golang.org/grpc/codes"
	"google.golang.org/grpc/status"

	"rowstead/proto"
	"rowstead/proto/frame"
	"rowstead/proto/link"
)

// connect makes ways to neighbours: it remembers who may call, calls others, and
// relays to the rest. The reply names those that could not be reached.
func (x *exchange) connect(ctx context.Context, o *proto.Connect) (reply, ints, floats, error) {
	if x.s.plan == nil {
		return nil, nil, nil, senseless("neighbours before the rows are settled")
	}
	blocks := len(x.s.placing.cuts) - 1
	x.mu.Lock()
	for _, p := range o.Expect {
		x.expected[p.Name] = int(p.Block)
	}
	for _, peer := range o.Relay {
		if peer >= 0 && int(peer) < blocks {
			x.ways[int(peer)] = newRelayed(x.s, int(peer), x.longest(int(peer)))
		}
	}
	x.mu.Unlock()
	out := &proto.Connected{}
	for _, p := range o.Dial {
		if x.dial(ctx, p) != nil {
			out.Unreached = append(out.Unreached, p.Block)
		}
	}
	return &proto.Reply{What: &proto.Reply_Connected{Connected: out}}, nil, nil, nil
}

// dial makes a direct way to p. The first frame that comes is a greeting without
// numbers: only then has the neighbour taken the call.
func (x *exchange) dial(ctx context.Context, p *proto.Connect_Peer) error {
	conn, err := link.Dial(p.Address, p.Name, x.s.identity)
	if err != nil {
		return err
	}
	streamCtx, cancel := context.WithCancel(context.Background())
	end := sync.OnceFunc(func() {
		cancel()
		conn.Close() // nothing is lost: the stream is of no more use
	})
	stop := context.AfterFunc(ctx, end)
	defer stop()
	timer := time.AfterFunc(link.HandshakeTime, end)
	defer timer.Stop()
	stream, err := proto.NewNeighbourClient(conn).Exchange(streamCtx)
	if err == nil {
		var greeting frame.Received
		if err = stream.RecvMsg(&greeting); err == nil {
			greeting.Free()
			if err = x.add(int(p.Block), stream, end); err == nil && !timer.Stop() {
				err = errors.New("the handshake took too long")
			}
		}
	}
	if err != nil {
		end()
		return fmt.Errorf("call %s: %w", p.Name, err)
	}
	return nil
}

// add makes stream the way to peer.
func (x *exchange) add(peer int, stream neighbourStream, end func()) error {
	x.mu.Lock()
	defer x.mu.Unlock()
	if x.closed {
		return errors.New("the session has ended")
	}
	x.streams = append(x.streams, end)
	x.ways[peer] = x.newDirect(stream, x.longest(peer), end)
	return nil
}

// Exchange takes the call of a neighbour and keeps it until it or the session
// ends.
func (x *exchange) Exchange(stream grpc.BidiStreamingServer[proto.Halo, proto.Halo]) error {
	name, err := link.PeerName(stream.Context())
	if err != nil {
		return status.Error(codes.Unauthenticated, err.Error())
	}
	x.mu.Lock()
	peer, known := x.expected[name]
	x.mu.Unlock()
	if !known {
		return status.Errorf(codes.PermissionDenied, "%s is not expected", name)
	}
	over := make(chan struct{})
	if err := x.add(peer, stream, sync.OnceFunc(func() { close(over) })); err != nil {
		return status.Error(codes.Unavailable, err.Error())
	}
	if err := stream.SendMsg(&frame.Frame{}); err != nil {
		return err
	}
	select {
	case <-over:
	case <-stream.Context().Done():
	}
	return nil
}
