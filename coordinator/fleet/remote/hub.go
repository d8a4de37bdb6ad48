// Package remote makes the members of a fleet of workers at the other end of
// connections: it hears workers that call, places row blocks with them, and turns
// verbs into orders and replies into sums.
//
// Its nouns are the Hub, which listens and issues permits, the Worker, the
// coordinator's side of one connection, and the Space over placed workers. Rows
// are global, zero-based, in the order of the given matrix; b and x are in the
// units of the file. A Space is used by one goroutine at a time. A Hub starts
// goroutines, all of which have ended when Close returns. Beside the matrix that
// is placed nothing of the length of the problem is kept.
package remote

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
	"rowstead/proto/keys"
	"rowstead/proto/link"
)

// Name is the coordinator's name in its certificate.
const Name = "coordinator"

// Hub hears the workers of one run, under an authority that lives in its memory.
type Hub struct {
	proto.UnimplementedCoordinatorServer
	authority *keys.Authority
	identity  keys.Identity
	server    *link.Server
	closing   chan struct{}
	once      sync.Once

	mu      sync.Mutex
	arrived map[string]chan *Worker // guarded by mu; by the names that have permits
	workers []*Worker               // guarded by mu; all that called
}

// Open listens on address for the workers of one run.
func Open(address string, now time.Time) (*Hub, error) {
	h := &Hub{closing: make(chan struct{}), arrived: map[string]chan *Worker{}}
	var err error
	if h.authority, err = keys.NewAuthority(now); err != nil {
		return nil, err
	}
	if h.identity, err = h.authority.Issue(Name); err != nil {
		return nil, err
	}
	h.server, err = link.Listen(address, h.identity, func(r grpc.ServiceRegistrar) { proto.RegisterCoordinatorServer(r, h) })
	if err != nil {
		return nil, fmt.Errorf("for workers: %w", err)
	}
	return h, nil
}

// Permit makes what a worker of that name needs to join; it may call once. The
// worker listens for its neighbours on the address listen.
func (h *Hub) Permit(name, listen string) (*proto.Permit, error) {
	id, err := h.authority.Issue(name)
	if err != nil {
		return nil, err
	}
	h.mu.Lock()
	h.arrived[name] = make(chan *Worker, 1)
	h.mu.Unlock()
	return &proto.Permit{
		Address: h.server.Address, Name: name, Listen: listen,
		Authority: id.Authority, Certificate: id.Certificate, PrivateKey: id.PrivateKey,
	}, nil
}

// Await waits for the worker of that name.
func (h *Hub) Await(ctx context.Context, name string) (*Worker, error) {
	h.mu.Lock()
	arrived := h.arrived[name]
	h.mu.Unlock()
	select {
	case w := <-arrived:
		return w, nil
	case <-ctx.Done():
		return nil, fmt.Errorf("%s has not joined: %w", name, context.Cause(ctx))
	}
}

// Serve takes the call of a worker and keeps it until either side ends it.
func (h *Hub) Serve(stream grpc.BidiStreamingServer[proto.Reply, proto.Order]) error {
	name, err := link.PeerName(stream.Context())
	if err != nil {
		return status.Error(codes.Unauthenticated, err.Error())
	}
	w, arrived := h.admit(name, stream)
	if w == nil {
		return status.Errorf(codes.PermissionDenied, "%s is not expected, or has joined before", name)
	}
	timer := time.AfterFunc(link.HandshakeTime, func() { w.pipe.End(errors.New("it did not introduce itself")) })
	defer timer.Stop()
	select {
	case hello := <-w.greeted:
		timer.Stop()
		w.neighbour = hello.Neighbour
		arrived <- w
	case <-w.pipe.Ended():
		return status.Error(codes.Aborted, w.pipe.Err().Error())
	case <-h.closing:
		w.pipe.End(errClosed)
		return nil
	}
	select {
	case <-w.pipe.Ended():
		return status.Error(codes.Aborted, w.pipe.Err().Error())
	case <-h.closing:
		w.pipe.Send(w.encode(&proto.Order{What: &proto.Order_Bye{Bye: &proto.Bye{}}}), nil) // one that is gone needs none
		select {
		case <-w.pipe.Ended(): // it hangs up
		case <-time.After(link.Beat):
		}
		w.pipe.End(errClosed)
		return nil
	}
}

// admit makes the worker of that name, if it has a permit and calls for the first
// time; else nil. It goes to arrived once it has introduced itself.
func (h *Hub) admit(name string, stream link.Stream) (w *Worker, arrived chan<- *Worker) {
	h.mu.Lock()
	defer h.mu.Unlock()
	expected, known := h.arrived[name]
	for _, earlier := range h.workers {
		known = known && earlier.name != name
	}
	if !known {
		return nil, nil
	}
	w = newWorker(name, stream)
	h.workers = append(h.workers, w)
	return w, expected
}

var errClosed = errors.New("the run is over")

// Close says goodbye to all workers and ends all connections.
func (h *Hub) Close() {
	h.once.Do(func() { close(h.closing) })
	h.mu.Lock()
	workers := append([]*Worker(nil), h.workers...)
	h.mu.Unlock()
	patience := time.NewTimer(2 * link.Beat)
	defer patience.Stop()
	for _, w := range workers {
		select {
		case <-w.pipe.Ended():
			continue
		case <-patience.C: // for all of them
		}
		break
	}
	h.server.Stop()
	for _, w := range workers {
		w.pipe.End(errClosed)
		w.pipe.Wait()
	}
}
