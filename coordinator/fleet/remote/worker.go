package remote

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"sync/atomic"
	"time"

	protobuf "google.golang.org/protobuf/proto"

	"rowstead/coordinator/fleet"
	"rowstead/proto"
	"rowstead/proto/link"
)

// Worker is the coordinator's side of a connection to one worker. Its methods are
// called by one goroutine at a time.
type Worker struct {
	name      string
	neighbour string // where its neighbours reach it
	pipe      *link.Pipe
	greeted   chan *proto.Hello
	explain   func() string // why its connection may have ended

	block  int       // set when it is placed
	lo, hi int       // its rows
	peers  []*Worker // all workers by block, for relays
	recent recent

	mu      sync.Mutex
	number  uint64      // guarded by mu; of the order that waits for its reply
	waiting chan answer // guarded by mu

	stepBytes atomic.Int64 // moved in steps, whole frames
}

// answer is a reply with its numbers.
type answer struct {
	*proto.Reply
	floats []float64
	ints   []int32
	bytes  int
}

func newWorker(name string, stream link.Stream) *Worker {
	w := &Worker{name: name, greeted: make(chan *proto.Hello, 1), explain: func() string { return "" }}
	w.recent.came = make(chan struct{}, 1)
	w.pipe = link.NewPipe(stream, w.encode(&proto.Order{What: &proto.Order_Beat{Beat: &proto.Beat{}}}), w.handle)
	return w
}

// Name is how people know the worker.
func (w *Worker) Name() string { return w.name }

// Explain sets what is asked when the connection has ended: a text that says why,
// or "". It is set before the worker is placed.
func (w *Worker) Explain(why func() string) { w.explain = why }

// Ended is closed when the connection has ended.
func (w *Worker) Ended() <-chan struct{} { return w.pipe.Ended() }

// encode is the control part of an order, which cannot fail.
func (w *Worker) encode(m protobuf.Message) []byte {
	b, err := protobuf.Marshal(m)
	if err != nil {
		panic("remote: a control part that cannot be encoded")
	}
	return b
}

// handle takes a message from the worker; it never waits for it.
func (w *Worker) handle(m link.Message) error {
	r := &proto.Reply{}
	if err := protobuf.Unmarshal(m.Control, r); err != nil {
		return fmt.Errorf("a reply that cannot be read: %w", err)
	}
	switch what := r.What.(type) {
	case *proto.Reply_Beat:
		return nil
	case *proto.Reply_Hello:
		if what.Hello.Version != proto.Version {
			return fmt.Errorf("it speaks version %d of the wire, this program version %d", what.Hello.Version, proto.Version)
		}
		select {
		case w.greeted <- what.Hello:
			return nil
		default:
			return errors.New("a second greeting")
		}
	case *proto.Reply_Behind:
		w.stepBytes.Add(int64(m.Bytes))
		return w.recent.put(int(what.Behind.Vector), m.Floats)
	case *proto.Reply_Relayed:
		return w.forward(what.Relayed.Peer, m.Floats)
	case *proto.Reply_Taken:
		return w.forward(what.Taken.Peer, nil)
	}
	w.mu.Lock()
	defer w.mu.Unlock()
	if w.waiting == nil || r.Number != w.number {
		return nil // the reply to an order that was given up
	}
	w.waiting <- answer{Reply: r, floats: m.Floats, ints: m.Ints, bytes: m.Bytes}
	w.waiting = nil
	return nil
}

// forward relays a round, or with nil the receipt for one, to the worker of block
// peer.
func (w *Worker) forward(peer int32, values []float64) error {
	if peer < 0 || int(peer) >= len(w.peers) || int(peer) == w.block {
		return fmt.Errorf("a halo for block %d, which there is not", peer+1)
	}
	to, o := w.peers[peer], &proto.Order{What: &proto.Order_Taken{Taken: &proto.Taken{Peer: int32(w.block)}}}
	if values != nil {
		o.What = &proto.Order_Relayed{Relayed: &proto.Relayed{Peer: int32(w.block)}}
	}
	to.pipe.SendBehind(to.encode(o), values) // one that is gone is told of by its own verbs
	return nil
}

// call sends an order and waits for its reply.
func (w *Worker) call(ctx context.Context, o *proto.Order, ints []int32, floats ...[]float64) (answer, error) {
	waiting := make(chan answer, 1)
	w.mu.Lock()
	w.number++
	o.Number, w.waiting = w.number, waiting
	w.mu.Unlock()
	sent, err := w.pipe.Send(w.encode(o), ints, floats...)
	if err != nil {
		return answer{}, w.broken(err)
	}
	select {
	case a := <-waiting:
		a.bytes += sent
		return a, w.failure(ctx, a.GetFailed())
	case <-ctx.Done():
		w.mu.Lock()
		w.waiting = nil
		w.mu.Unlock()
		w.pipe.SendBehind(w.encode(&proto.Order{What: &proto.Order_Cancel{Cancel: &proto.Cancel{Number: o.Number}}})) // one that is gone needs none
		return answer{}, ctx.Err()
	case <-w.pipe.Ended():
		return answer{}, w.broken(w.pipe.Err())
	}
}

// broken says why the connection does not work any more. It hides the cause: a
// stream that was cancelled elsewhere must not pass for a verb that was
// cancelled because another one failed.
func (w *Worker) broken(err error) error {
	select {
	case <-w.pipe.Ended():
		err = w.pipe.Err()
	case <-time.After(link.Beat):
	}
	if why := w.explain(); why != "" {
		return errors.New(why)
	}
	return fmt.Errorf("its connection has ended: %v", err)
}

// lostNeighbour waits until the connection of a neighbour proves to have ended,
// or ctx ends because its own verb has told so.
func (w *Worker) lostNeighbour(ctx context.Context, f *proto.Failed) error {
	ctx, stop := context.WithTimeout(ctx, link.Silence+link.Beat)
	defer stop()
	look := time.NewTicker(10 * time.Millisecond)
	defer look.Stop()
	for ctx.Err() == nil {
		for _, p := range w.peers {
			select {
			case <-p.Ended():
				return &fleet.ElsewhereError{Block: p.block, Err: p.broken(p.pipe.Err())}
			default:
			}
		}
		select {
		case <-look.C:
		case <-ctx.Done():
		}
	}
	if errors.Is(ctx.Err(), context.DeadlineExceeded) {
		return errors.New(f.Text)
	}
	return ctx.Err()
}

// failure makes an error of what the worker said. When a neighbour of it went
// away, the neighbour's own connection tells more: its error cancels ctx.
func (w *Worker) failure(ctx context.Context, f *proto.Failed) error {
	if f == nil {
		return nil
	}
	switch f.Kind {
	case proto.Failed_REFUSED:
		return fmt.Errorf("%w: %s", fleet.ErrRefused, f.Text)
	case proto.Failed_CANCELLED:
		if ctx.Err() == nil { // nobody here asked for it: the worker is going away
			return w.broken(errors.New(f.Text))
		}
		return fmt.Errorf("%w: %s", context.Canceled, f.Text)
	case proto.Failed_NEIGHBOUR:
		return w.lostNeighbour(ctx, f)
	}
	return errors.New(f.Text)
}

// ask is call for an order whose reply is done.
func (w *Worker) ask(ctx context.Context, o *proto.Order, ints []int32, floats ...[]float64) error {
	a, err := w.call(ctx, o, ints, floats...)
	if err == nil && a.GetDone() == nil {
		err = errAnswer
	}
	return err
}

var errAnswer = errors.New("the reply is of another kind than the order asks for")
