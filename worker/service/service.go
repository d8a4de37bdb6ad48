// Package service is the worker's side of the wire: it joins a run with a permit,
// builds a worker.Block from the rows that the coordinator sends, carries out
// verbs on it, and exchanges halos with its neighbours.
//
// Its noun is the session, one stay in one run. Orders are carried out one at a
// time, in the order in which they come; only heartbeats, relayed halos and
// cancellations overtake them. Rows and columns are global unless a name says
// local. A session starts goroutines and Run waits for all of them.
package service

import (
	"context"
	"errors"
	"fmt"

	"google.golang.org/grpc"
	protobuf "google.golang.org/protobuf/proto"

	"rowstead/partition"
	"rowstead/proto"
	"rowstead/proto/keys"
	"rowstead/proto/link"
	"rowstead/worker"
)

// CoordinatorName is the coordinator's name in its certificate.
const CoordinatorName = "coordinator"

// Options are what a session must be told of its surroundings.
type Options struct {
	// Peak returns the largest size of this process so far in bytes; 0: unknown.
	Peak func() int64
	// Free returns how many bytes could be used; an error: unknown, nothing is
	// refused.
	Free func() (int64, error)
	// Threads, if not nil, is told how many threads the rows will be worked on with.
	Threads func(count int)
	// Lost, if not nil, is called when the connection to the coordinator has ended
	// or the coordinator has said goodbye; a verb may still be in work then.
	Lost func()
}

// session is one stay in one run.
type session struct {
	options  Options
	identity keys.Identity
	pipe     *link.Pipe
	orders   chan order
	current  running

	placing  placing
	plan     *partition.BlockHalo
	exchange *exchange
	block    *worker.Block
	cycle    worker.Cycle // the last one started
	vectors  int          // of it so far
	solution []float64    // x while it is fetched
	room     float64      // bytes of the largest cycle so far
}

// order is an order with its numbers.
type order struct {
	*proto.Order
	floats []float64
	ints   []int32
}

var errBye = errors.New("the coordinator has said goodbye")

func newSession(permit *proto.Permit, o Options) *session {
	s := &session{
		options: o, orders: make(chan order, 4),
		identity: keys.Identity{Authority: permit.Authority, Certificate: permit.Certificate, PrivateKey: permit.PrivateKey},
	}
	s.exchange = newExchange(s)
	return s
}

// Run joins the run of permit and serves it until the coordinator says goodbye,
// which is no error, or the connection or ctx ends.
func Run(ctx context.Context, permit *proto.Permit, o Options) error {
	s := newSession(permit, o)
	server, err := link.Listen(permit.Listen, s.identity, func(r grpc.ServiceRegistrar) {
		proto.RegisterNeighbourServer(r, s.exchange)
	})
	if err != nil {
		return fmt.Errorf("%s: for neighbours: %w", permit.Name, err)
	}
	defer server.Stop()
	defer s.exchange.close()
	conn, err := link.Dial(permit.Address, CoordinatorName, s.identity)
	if err != nil {
		return fmt.Errorf("%s: %w", permit.Name, err)
	}
	defer conn.Close()
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	stream, err := proto.NewCoordinatorClient(conn).Serve(ctx)
	if err != nil {
		return fmt.Errorf("%s: call the coordinator: %w", permit.Name, err)
	}
	s.pipe = link.NewPipe(stream, encode(&proto.Reply{What: &proto.Reply_Beat{Beat: &proto.Beat{}}}), s.handle)
	defer s.pipe.Wait()
	defer cancel()
	if o.Lost != nil {
		stop := context.AfterFunc(s.pipe.Over(), o.Lost)
		defer stop()
	}
	hello := &proto.Hello{Version: proto.Version, Neighbour: server.Address}
	s.send(&proto.Reply{What: &proto.Reply_Hello{Hello: hello}}, nil) // a failure ends the pipe
	err = s.serve(ctx)
	if s.block != nil {
		s.block.Close()
	}
	if !errors.Is(err, errBye) {
		return fmt.Errorf("%s: %w", permit.Name, err)
	}
	return nil
}

// encode is the control part of a message of ours, which cannot fail.
func encode(m protobuf.Message) []byte {
	b, err := protobuf.Marshal(m)
	if err != nil {
		panic("service: a control part that cannot be encoded")
	}
	return b
}

// send sends a reply.
func (s *session) send(r *proto.Reply, ints []int32, floats ...[]float64) (int, error) {
	return s.pipe.Send(encode(r), ints, floats...)
}

// handle takes a message from the coordinator; it never waits.
func (s *session) handle(m link.Message) error {
	o := order{Order: &proto.Order{}, floats: m.Floats, ints: m.Ints}
	if err := protobuf.Unmarshal(m.Control, o.Order); err != nil {
		return fmt.Errorf("an order that cannot be read: %w", err)
	}
	switch what := o.What.(type) {
	case *proto.Order_Beat:
	case *proto.Order_Cancel:
		s.current.cancel(what.Cancel.Number)
	case *proto.Order_Relayed:
		return s.exchange.relayed(int(what.Relayed.Peer), m.Floats)
	case *proto.Order_Taken:
		return s.exchange.taken(int(what.Taken.Peer))
	case *proto.Order_Bye:
		return errBye
	default:
		select {
		case s.orders <- o:
		default:
			return errors.New("more orders than can wait")
		}
	}
	return nil
}

// serve carries out orders until the pipe or ctx ends.
func (s *session) serve(ctx context.Context) error {
	for {
		select {
		case <-ctx.Done():
			s.pipe.End(context.Cause(ctx))
			return s.pipe.Err()
		case <-s.pipe.Ended():
			return s.pipe.Err()
		case o := <-s.orders:
			s.answer(ctx, o)
		}
	}
}

// answer carries out one order and replies to it. The pipe knows of failures to
// send.
func (s *session) answer(ctx context.Context, o order) {
	ctx, done := s.current.begin(ctx, s.pipe, o.Number)
	defer done()
	reply, ints, floats, err := s.carryOut(ctx, o)
	if err != nil {
		reply, ints, floats = &proto.Reply{What: &proto.Reply_Failed{Failed: failed(err)}}, nil, nil
	}
	reply.Number = o.Number
	if _, startsAfresh := o.What.(*proto.Order_Start); startsAfresh {
		if s.pipe.Flush() != nil {
			return
		}
	}
	if _, err := s.send(reply, ints, floats...); err != nil {
		return
	}
	if o.GetAdvance() != nil && s.cycle.SketchRows > 0 && reply.GetSums() != nil {
		s.sendSketch(ctx)
	}
}

// sendSketch sends the sketches of the newest vector behind the answer to its
// step.
func (s *session) sendSketch(ctx context.Context) {
	sums, err := s.block.Sketches(ctx, s.vectors-1, s.vectors)
	if err != nil {
		return // it cannot be refused after the step that made it
	}
	what := &proto.Behind{Vector: int64(s.vectors - 1)}
	s.pipe.SendBehind(encode(&proto.Reply{What: &proto.Reply_Behind{Behind: what}}), sums.Sketch, sums.Hold)
}

// failed says in the words of the wire why a verb was not carried out.
func failed(err error) *proto.Failed {
	f := &proto.Failed{Kind: proto.Failed_OTHER, Text: err.Error()}
	var refusal *worker.Refusal
	var input *inputError
	switch {
	case errors.As(err, &refusal):
		f.Kind = proto.Failed_REFUSED
	case errors.As(err, &input):
		f.Kind = proto.Failed_INPUT
	case errors.Is(err, errNeighbour):
		f.Kind = proto.Failed_NEIGHBOUR
	case errors.Is(err, context.Canceled):
		f.Kind = proto.Failed_CANCELLED
	}
	return f
}

// inputError says that an order makes no sense.
type inputError struct{ text string }

func (e *inputError) Error() string { return e.text }

func senseless(format string, values ...any) error {
	return &inputError{fmt.Sprintf(format, values...)}
}
