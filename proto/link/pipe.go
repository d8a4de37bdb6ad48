package link

import (
	"context"
	"errors"
	"fmt"
	"io"
	"sync"
	"sync/atomic"
	"time"

	"google.golang.org/grpc/status"

	"rowstead/proto/frame"
)

// The pulse: both sides send something at least every Beat, and who hears
// nothing for Silence gives the other up.
const (
	Beat    = time.Second
	Silence = 5 * time.Second
)

// MaxMessage bounds the numbers of one message, all its frames together.
const MaxMessage = 1 << 24

// behindMost is how many messages may wait behind; then SendBehind waits.
const behindMost = 64

// ErrSilent says that the other side has not been heard of for Silence.
var ErrSilent = errors.New("nothing was heard for five seconds")

// ErrEnded says that the other side has closed the stream.
var ErrEnded = errors.New("the connection has ended")

// Stream is what a Pipe needs of either end of a gRPC stream.
type Stream interface {
	SendMsg(m any) error
	RecvMsg(m any) error
}

// Message is a control part with numbers, however many frames it takes.
type Message struct {
	Control []byte
	Floats  []float64
	Ints    []int32
	Bytes   int // on the wire
}

// Pipe sends and receives messages over one stream. Send and SendBehind may be
// called by several goroutines.
type Pipe struct {
	stream Stream
	beat   []byte     // control part of a heartbeat
	sender sync.Mutex // held while the frames of a message go out

	heard  atomic.Int64 // when a frame came last, in ns since begun
	begun  time.Time
	behind chan behind

	end   context.CancelCauseFunc
	ended context.Context
	all   sync.WaitGroup
}

// NewPipe starts a pipe over stream. handle is called with every message,
// heartbeats included, one at a time; it must not wait for a later one. Its error
// ends the pipe. beat is the control part of our heartbeats.
func NewPipe(stream Stream, beat []byte, handle func(Message) error) *Pipe {
	p := &Pipe{stream: stream, beat: beat, begun: time.Now(), behind: make(chan behind, behindMost)}
	p.ended, p.end = context.WithCancelCause(context.Background())
	p.all.Go(func() { p.end(p.receive(handle)) })
	p.all.Go(p.pulse)
	p.all.Go(p.watch)
	p.all.Go(p.sendBehind)
	return p
}

// Ended is closed when the pipe has ended; Err then says why.
func (p *Pipe) Ended() <-chan struct{} { return p.ended.Done() }

// Over is a context that is done when the pipe has ended.
func (p *Pipe) Over() context.Context { return p.ended }

// Err says why the pipe has ended, nil while it has not.
func (p *Pipe) Err() error { return context.Cause(p.ended) }

// End ends the pipe with that cause, unless it has ended. The owner of the stream
// must then end the stream.
func (p *Pipe) End(cause error) { p.end(cause) }

// Wait returns when every goroutine of the pipe has ended; the stream must have
// been ended.
func (p *Pipe) Wait() { p.all.Wait() }

// Send sends a message and returns its bytes on the wire. Slices may change as
// soon as it has returned. Several blocks of floats are sent as one.
func (p *Pipe) Send(control []byte, ints []int32, floats ...[]float64) (int, error) {
	p.sender.Lock()
	defer p.sender.Unlock()
	bytes := 0
	send := func(f *frame.Frame) error {
		bytes += f.Bytes()
		return p.write(f)
	}
	last := &frame.Frame{Control: control, Ints: ints}
	if len(floats) == 1 && 2*len(floats[0])+len(ints) <= 2*frame.MaxNumbers {
		last.Floats = floats[0]
		return last.Bytes(), p.write(last)
	}
	for ; len(last.Ints) > frame.MaxNumbers; last.Ints = last.Ints[frame.MaxNumbers:] {
		if err := send(&frame.Frame{Ints: last.Ints[:frame.MaxNumbers], More: true}); err != nil {
			return bytes, err
		}
	}
	total := 0
	for _, block := range floats {
		total += len(block)
	}
	joined := make([]float64, 0, min(total, frame.MaxNumbers))
	for _, block := range floats {
		for len(block) > 0 {
			room := min(len(block), frame.MaxNumbers/2-len(joined))
			joined, block = append(joined, block[:room]...), block[room:]
			if len(joined) < frame.MaxNumbers/2 || total == len(joined) {
				continue
			}
			if err := send(&frame.Frame{Floats: joined, More: true}); err != nil {
				return bytes, err
			}
			total, joined = total-len(joined), joined[:0]
		}
	}
	last.Floats = joined
	return bytes + last.Bytes(), p.write(last)
}

// write sends one frame. The cause of a broken stream is known to receive.
func (p *Pipe) write(f *frame.Frame) error {
	err := p.stream.SendMsg(f)
	if err == nil {
		return nil
	}
	var fault *frame.Error
	if errors.As(err, &fault) {
		return err
	}
	return fmt.Errorf("send: %w", err)
}

// behind is a message that waits, or a wish to know that those before it have
// gone.
type behind struct {
	control []byte
	floats  []float64
	gone    chan struct{}
}

// SendBehind sends a message when nothing more urgent is to be sent. The floats
// are copied.
func (p *Pipe) SendBehind(control []byte, floats ...[]float64) error {
	m := behind{control: control}
	for _, block := range floats {
		m.floats = append(m.floats, block...)
	}
	return p.queue(m)
}

// Flush waits until everything that was to be sent behind has been sent.
func (p *Pipe) Flush() error {
	gone := make(chan struct{})
	if err := p.queue(behind{gone: gone}); err != nil {
		return err
	}
	select {
	case <-gone:
		return nil
	case <-p.ended.Done():
		return p.Err()
	}
}

func (p *Pipe) queue(m behind) error {
	if err := p.Err(); err != nil {
		return err
	}
	select {
	case p.behind <- m:
		return nil
	case <-p.ended.Done():
		return p.Err()
	}
}

func (p *Pipe) sendBehind() {
	for {
		select {
		case <-p.ended.Done():
			return
		case m := <-p.behind:
			if m.gone != nil {
				close(m.gone)
				continue
			}
			if _, err := p.Send(m.control, nil, m.floats); err != nil {
				return // receive knows why
			}
		}
	}
}

// receive joins frames to messages until the stream ends.
func (p *Pipe) receive(handle func(Message) error) error {
	var m Message
	for {
		var r frame.Received
		if err := p.stream.RecvMsg(&r); err != nil {
			if errors.Is(err, io.EOF) {
				return ErrEnded
			}
			return fmt.Errorf("%w: %s", ErrEnded, status.Convert(err).Message())
		}
		p.heard.Store(int64(time.Since(p.begun)))
		if len(m.Floats)+len(m.Ints)+r.Floats+r.Ints > MaxMessage {
			r.Free()
			return &frame.Error{Text: "a message of too many numbers"}
		}
		m.take(&r)
		if r.More {
			continue
		}
		m.Control = r.Control
		if err := handle(m); err != nil {
			return err
		}
		m = Message{}
	}
}

// take appends the numbers of r and frees it.
func (m *Message) take(r *frame.Received) {
	m.Bytes += r.Bytes()
	if n := len(m.Floats); r.Floats > 0 {
		m.Floats = append(m.Floats, make([]float64, r.Floats)...)
		r.CopyFloats(m.Floats[n:])
	}
	if n := len(m.Ints); r.Ints > 0 {
		m.Ints = append(m.Ints, make([]int32, r.Ints)...)
		r.CopyInts(m.Ints[n:])
	}
	r.Free()
}

// pulse sends a heartbeat every Beat.
func (p *Pipe) pulse() {
	ticker := time.NewTicker(Beat)
	defer ticker.Stop()
	for {
		select {
		case <-p.ended.Done():
			return
		case <-ticker.C:
		}
		if _, err := p.Send(p.beat, nil); err != nil {
			return // receive knows why
		}
	}
}

// watch ends the pipe when nothing has been heard for Silence.
func (p *Pipe) watch() {
	timer := time.NewTimer(Silence)
	defer timer.Stop()
	for {
		select {
		case <-p.ended.Done():
			return
		case <-timer.C:
		}
		quiet := time.Since(p.begun) - time.Duration(p.heard.Load())
		if quiet >= Silence {
			p.end(ErrSilent)
			return
		}
		timer.Reset(Silence - quiet)
	}
}
