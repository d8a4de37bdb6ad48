package service

import (
	"context"
	"fmt"
	"sync"

	"google.golang.org/grpc"

	"rowstead/partition"
	"rowstead/proto"
	"rowstead/proto/frame"
	"rowstead/worker/halo"
)

// exchange is the halo.Exchange of a session: a way to each neighbour, by a
// stream of its own or through the coordinator. Post and Collect are called by the
// goroutine that carries out orders.
type exchange struct {
	proto.UnimplementedNeighbourServer
	s *session

	mu       sync.Mutex
	expected map[string]int // guarded by mu; blocks of those who may call, by name
	ways     map[int]way    // guarded by mu; by block
	streams  []func()       // guarded by mu; each ends one stream or connection
	closed   bool           // guarded by mu
	readers  sync.WaitGroup // goroutines that read streams

	// counting says that what is posted belongs to a step of a method.
	counting            bool
	bytes, relayedBytes int64 // posted in steps, whole frames
}

// way is how halos go to and come from one neighbour.
type way interface {
	// post sends values, which may change once it has returned, and returns the
	// bytes on the wire.
	post(ctx context.Context, values []float64) (bytes int, relayed bool, err error)
	collect(ctx context.Context, into []float64) error
}

var _ halo.Exchange = (*exchange)(nil)

func newExchange(s *session) *exchange {
	return &exchange{s: s, expected: map[string]int{}, ways: map[int]way{}}
}

// Post implements halo.Exchange.
func (x *exchange) Post(ctx context.Context, peer int, values []float64) error {
	bytes, relayed, err := x.to(peer).post(ctx, values)
	if x.counting {
		x.bytes += int64(bytes)
		if relayed {
			x.relayedBytes += int64(bytes)
		}
	}
	return x.named(peer, err)
}

// Collect implements halo.Exchange.
func (x *exchange) Collect(ctx context.Context, peer int, into []float64) error {
	return x.named(peer, x.to(peer).collect(ctx, into))
}

func (x *exchange) named(peer int, err error) error {
	if err == nil {
		return nil
	}
	return fmt.Errorf("halo of block %d: %w", peer+1, err)
}

// to is the way to a peer, which build has made sure of.
func (x *exchange) to(peer int) way {
	x.mu.Lock()
	defer x.mu.Unlock()
	return x.ways[peer]
}

// missing returns the first peer of the plan without a way, or -1.
func (x *exchange) missing(plan *partition.BlockHalo) int {
	for _, r := range plan.Receive {
		if x.to(r.Peer) == nil {
			return r.Peer
		}
	}
	for _, s := range plan.Send {
		if x.to(s.Peer) == nil {
			return s.Peer
		}
	}
	return -1
}

// longest is how many numbers a round brings from peer at most.
func (x *exchange) longest(peer int) int {
	most := 0
	for _, r := range x.s.plan.Receive {
		if r.Peer == peer {
			most = r.Hi - r.Lo
		}
	}
	for _, s := range x.s.plan.Send {
		if s.Peer == peer {
			most = max(most, len(s.LocalRows))
		}
	}
	return most
}

// close ends all streams and waits for their readers.
func (x *exchange) close() {
	x.mu.Lock()
	x.closed = true
	streams := x.streams
	x.mu.Unlock()
	for _, end := range streams {
		end()
	}
	x.readers.Wait()
}

// neighbourStream is either end of a stream between neighbours.
type neighbourStream interface {
	Context() context.Context
	SendMsg(m any) error
	RecvMsg(m any) error
}

var (
	_ neighbourStream = (grpc.ServerStream)(nil)
	_ neighbourStream = (grpc.ClientStream)(nil)
)

// direct is a way by a stream of its own.
type direct struct {
	stream neighbourStream
	end    func() // ends the stream
	inbox  *inbox
}

// newDirect starts to read stream, from which a round brings so many numbers at
// most. end must end the stream.
func (x *exchange) newDirect(stream neighbourStream, longest int, end func()) *direct {
	d := &direct{stream: stream, end: end, inbox: newInbox(2*longest + 1)}
	x.readers.Go(func() { d.inbox.fail(d.read()) })
	return d
}

// read fills the inbox until the stream ends. It reads a whole round ahead of
// collect, so that two neighbours who post to each other never wait for each
// other.
func (d *direct) read() error {
	for {
		r := &frame.Received{}
		if err := d.stream.RecvMsg(r); err != nil {
			return fmt.Errorf("%w: %w", errNeighbour, err)
		}
		if !d.inbox.push(d.stream.Context().Done(), r) {
			r.Free()
			return errNeighbour
		}
	}
}

func (d *direct) post(ctx context.Context, values []float64) (bytes int, relayed bool, err error) {
	stop := context.AfterFunc(ctx, d.end)
	defer stop()
	for {
		n := min(len(values), frame.MaxNumbers)
		f := &frame.Frame{Floats: values[:n], More: n < len(values)}
		if err := d.stream.SendMsg(f); err != nil {
			if ctx.Err() != nil {
				return bytes, false, ctx.Err()
			}
			return bytes, false, fmt.Errorf("%w: %w", errNeighbour, err)
		}
		bytes += f.Bytes()
		if values = values[n:]; len(values) == 0 {
			return bytes, false, nil
		}
	}
}

func (d *direct) collect(ctx context.Context, into []float64) error {
	for {
		r, err := d.inbox.pull(ctx)
		if err != nil {
			return err
		}
		n, more := r.Floats, r.More
		if n > len(into) || (!more && n < len(into)) {
			r.Free()
			return fmt.Errorf("%d entries came, expected %d", n, len(into))
		}
		r.CopyFloats(into[:n])
		r.Free()
		if into = into[n:]; !more {
			return nil
		}
	}
}
