package link

import (
	"context"
	"encoding/binary"
	"errors"
	"io"
	"slices"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"
	"google.golang.org/grpc"
	"google.golang.org/grpc/encoding"
	"google.golang.org/grpc/mem"
	"pgregory.net/rapid"

	"rowstead/proto/frame"
	"rowstead/proto/keys"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// lane carries frames one way, as bytes, like a stream of gRPC.
type lane struct {
	bytes chan []byte
	over  chan struct{}
	once  *sync.Once
	stuck chan struct{} // if not nil, sending waits for it
}

func newLane() lane {
	return lane{bytes: make(chan []byte, 1024), over: make(chan struct{}), once: new(sync.Once)}
}

// end is one end of a connection of two lanes.
type end struct{ out, in lane }

func newEnds() (a, b *end) {
	x, y := newLane(), newLane()
	return &end{out: x, in: y}, &end{out: y, in: x}
}

func (e *end) SendMsg(m any) error {
	b, err := (&frame.Codec{}).Marshal(m)
	if err != nil {
		return err
	}
	if e.out.stuck != nil {
		<-e.out.stuck
	}
	select {
	case e.out.bytes <- b.Materialize():
		return nil
	case <-e.out.over:
		return io.EOF
	}
}

func (e *end) RecvMsg(m any) error {
	select {
	case b := <-e.in.bytes:
		return (&frame.Codec{}).Unmarshal(mem.BufferSlice{mem.SliceBuffer(b)}, m)
	case <-e.in.over:
		return io.EOF
	}
}

// close ends both lanes.
func (e *end) close() {
	e.in.once.Do(func() { close(e.in.over) })
	e.out.once.Do(func() { close(e.out.over) })
}

var beat = []byte("beat")

// collect is a handler that passes on all but heartbeats.
func collect(into chan<- Message) func(Message) error {
	return func(m Message) error {
		if string(m.Control) != string(beat) {
			into <- m
		}
		return nil
	}
}

// Whatever the blocks and their lengths, a message arrives as it was sent, their
// numbers joined, and both sides count the same bytes.
func TestMessagesArriveWhole(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := newEnds()
		came := make(chan Message, 1)
		sender := NewPipe(a, beat, func(Message) error { return nil })
		receiver := NewPipe(b, beat, collect(came))
		size := rapid.SampledFrom([]int{0, 1, 7, frame.MaxNumbers / 2, frame.MaxNumbers, frame.MaxNumbers + 1, 2*frame.MaxNumbers + 3})
		var blocks [][]float64
		var want []float64
		for range rapid.IntRange(0, 3).Draw(t, "blocks") {
			block := make([]float64, size.Draw(t, "floats"))
			for i := range block {
				block[i] = float64(len(want) + i)
			}
			blocks, want = append(blocks, block), append(want, block...)
		}
		ints := make([]int32, size.Draw(t, "ints"))
		for i := range ints {
			ints[i] = int32(i)
		}
		sent, err := sender.Send([]byte("order"), ints, blocks...)
		if err != nil {
			t.Fatal(err)
		}
		m := <-came
		if string(m.Control) != "order" || !slices.Equal(m.Floats, want) || !slices.Equal(m.Ints, ints) || m.Bytes != sent {
			t.Fatalf("%d floats, %d ints, %d bytes came; %d, %d and %d were sent", len(m.Floats), len(m.Ints), m.Bytes, len(want), len(ints), sent)
		}
		a.close()
		sender.Wait()
		receiver.Wait()
		if !errors.Is(sender.Err(), ErrEnded) || !errors.Is(receiver.Err(), ErrEnded) {
			t.Fatalf("ended with %v and %v", sender.Err(), receiver.Err())
		}
	})
}

// What is sent behind arrives in order, is copied, and Flush waits for it.
func TestBehind(t *testing.T) {
	a, b := newEnds()
	came := make(chan Message, 200)
	sender, receiver := NewPipe(a, beat, func(Message) error { return nil }), NewPipe(b, beat, collect(came))
	v := []float64{0}
	for i := range 150 {
		v[0] = float64(i)
		if err := sender.SendBehind([]byte("behind"), v); err != nil {
			t.Fatal(err)
		}
	}
	if err := sender.Flush(); err != nil {
		t.Fatal(err)
	}
	if _, err := sender.Send([]byte("last"), nil); err != nil {
		t.Fatal(err)
	}
	for i := range 150 {
		if m := <-came; m.Floats[0] != float64(i) {
			t.Fatalf("message %d has %v", i, m.Floats)
		}
	}
	if m := <-came; string(m.Control) != "last" {
		t.Errorf("after Flush came %q", m.Control)
	}
	a.close()
	sender.Wait()
	receiver.Wait()
	if err := sender.SendBehind(beat); err == nil {
		t.Error("SendBehind on an ended pipe: no error")
	}
	if err := sender.Flush(); err == nil {
		t.Error("Flush on an ended pipe: no error")
	}
}

// Two that say nothing for an hour know that the other lives; one that falls
// silent, or whose lane is stuck, is given up after five seconds.
func TestPulse(t *testing.T) {
	for _, stuck := range []bool{false, true} {
		synctest.Test(t, func(t *testing.T) {
			a, b := newEnds()
			quiet := func(Message) error { return nil }
			first, second := NewPipe(a, beat, quiet), NewPipe(b, beat, quiet)
			time.Sleep(time.Hour)
			if first.Err() != nil || second.Err() != nil {
				t.Fatalf("after an hour: %v, %v", first.Err(), second.Err())
			}
			began := time.Now()
			if stuck { // the second still lives, but nothing of it gets through
				b.out.stuck = make(chan struct{})
			} else {
				second.End(errors.New("frozen"))
			}
			<-first.Ended()
			if took := time.Since(began); !errors.Is(first.Err(), ErrSilent) || took > Silence+Beat || took < Silence-Beat {
				t.Errorf("stuck %v: given up after %v: %v", stuck, took, first.Err())
			}
			second.End(nil)
			a.close()
			if stuck {
				close(b.out.stuck)
			}
			first.Wait()
			second.Wait()
		})
	}
}

// A handler's error, a malformed frame and a message without end end the pipe.
func TestBadMessagesEndThePipe(t *testing.T) {
	broken := errors.New("nonsense")
	for name, c := range map[string]struct {
		spoil func(e *end)
		want  string
	}{
		"refused by the handler": {func(e *end) { e.SendMsg(&frame.Frame{Control: []byte("x")}) }, "nonsense"},
		"not a frame":            {func(e *end) { e.out.bytes <- []byte("hello, I am no frame at all") }, "rsf1"},
		"too long": {func(e *end) {
			f := &frame.Frame{Floats: make([]float64, frame.MaxNumbers), More: true}
			b, _ := (&frame.Codec{}).Marshal(f)
			one := b.Materialize()
			for range MaxMessage/frame.MaxNumbers + 1 {
				e.out.bytes <- one
			}
		}, "too many numbers"},
	} {
		if name == "too long" && testing.Short() {
			continue
		}
		a, b := newEnds()
		p := NewPipe(b, beat, func(Message) error { return broken })
		c.spoil(a)
		<-p.Ended()
		if err := p.Err(); !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
		a.close()
		p.Wait()
	}
}

// echo sends every frame back.
type echo struct{ names chan string }

// describe is a service of one stream without generated code.
func (e *echo) describe() *grpc.ServiceDesc {
	return &grpc.ServiceDesc{ServiceName: "test.Echo", HandlerType: (*any)(nil), Streams: []grpc.StreamDesc{{
		StreamName: "Echo", ServerStreams: true, ClientStreams: true,
		Handler: func(_ any, s grpc.ServerStream) error {
			name, err := PeerName(s.Context())
			if err != nil {
				return err
			}
			e.names <- name
			for {
				var r frame.Received
				if err := s.RecvMsg(&r); err != nil {
					return err
				}
				floats := make([]float64, r.Floats)
				r.CopyFloats(floats)
				r.Free()
				if err := s.SendMsg(&frame.Frame{Control: r.Control, Floats: floats}); err != nil {
					return err
				}
			}
		},
	}}}
}

// raw sends bytes as they are.
type raw struct{ *frame.Codec }

func (raw) Marshal(v any) (mem.BufferSlice, error) {
	return mem.BufferSlice{mem.SliceBuffer(v.([]byte))}, nil
}

var _ encoding.CodecV2 = raw{}

func TestConnections(t *testing.T) {
	authority, err := keys.NewAuthority(time.Now())
	if err != nil {
		t.Fatal(err)
	}
	other, err := keys.NewAuthority(time.Now())
	if err != nil {
		t.Fatal(err)
	}
	identity := func(a *keys.Authority, name string) keys.Identity {
		id, err := a.Issue(name)
		if err != nil {
			t.Fatal(err)
		}
		return id
	}
	e := &echo{names: make(chan string, 10)}
	server, err := Listen("127.0.0.1:0", identity(authority, "coordinator"), func(r grpc.ServiceRegistrar) { r.RegisterService(e.describe(), e) })
	if err != nil {
		t.Fatal(err)
	}
	defer server.Stop()
	largest := &frame.Frame{Control: make([]byte, frame.MaxControl), Floats: make([]float64, frame.MaxNumbers)}
	whole, _ := (&frame.Codec{}).Marshal(largest)
	longer := append(whole.Materialize(), 0)
	binary.LittleEndian.PutUint32(longer[16:], 1)
	for name, c := range map[string]struct {
		id      keys.Identity
		peer    string
		send    any
		options []grpc.CallOption
		want    string // of the error; "": none
	}{
		"a worker":                 {id: identity(authority, "worker-1"), peer: "coordinator", send: largest},
		"another authority":        {id: identity(other, "worker-1"), peer: "coordinator", send: largest, want: "certificate"},
		"another name":             {id: identity(authority, "worker-1"), peer: "worker-2", send: largest, want: "certificate is valid for coordinator"},
		"a message that is longer": {id: identity(authority, "worker-1"), peer: "coordinator", send: longer, options: []grpc.CallOption{grpc.ForceCodecV2(raw{&frame.Codec{}}), grpc.MaxCallSendMsgSize(1 << 24)}, want: "larger than max"},
		"no frame":                 {id: identity(authority, "worker-1"), peer: "coordinator", send: []byte("no frame of ours, but long enough"), options: []grpc.CallOption{grpc.ForceCodecV2(raw{&frame.Codec{}})}, want: "rsf1"},
	} {
		err := exchange(server.Address, c.peer, c.id, c.send, c.options)
		if (err == nil) != (c.want == "") || (err != nil && !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
	if name := <-e.names; name != "worker-1" {
		t.Errorf("the server knows the caller as %q", name)
	}
}

// exchange sends one message and waits for the answer.
func exchange(address, peer string, id keys.Identity, send any, options []grpc.CallOption) error {
	conn, err := Dial(address, peer, id)
	if err != nil {
		return err
	}
	defer conn.Close()
	ctx, cancel := context.WithTimeout(context.Background(), HandshakeTime)
	defer cancel()
	stream, err := conn.NewStream(ctx, &grpc.StreamDesc{ServerStreams: true, ClientStreams: true}, "/test.Echo/Echo", options...)
	if err != nil {
		return err
	}
	if err := stream.SendMsg(send); err != nil && !errors.Is(err, io.EOF) {
		return err
	}
	var r frame.Received
	if err := stream.RecvMsg(&r); err != nil {
		return err
	}
	r.Free()
	return nil
}
