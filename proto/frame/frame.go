// Package frame is the codec of the wire: one message is one frame, a control
// part, whose meaning is the caller's, and blocks of numbers that are copied
// once at each end and checked by a checksum.
//
// Its nouns are Frame, what is sent, and Received, what came. A frame is, in
// little-endian order and without gaps:
//
//	0   4   magic "rsf1"
//	4   4   flags: 1 more frames of the same message follow
//	8   4   length of the control part in bytes, at most MaxControl
//	12  4   number of floats ┐ together at most MaxNumbers, an integer
//	16  4   number of ints   ┘ counted as half
//	20  4   CRC-32C of all other bytes, in order
//	24      control part, floats of 8 bytes (IEEE 754), ints of 4 bytes
//
// The length of a frame follows from its header, and every bound is checked
// before memory is taken. The package does no I/O and starts no goroutine. A
// Codec may be shared by goroutines; a Received belongs to one.
package frame

import (
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"sync"

	"google.golang.org/grpc/mem"
)

// Bounds of a frame. MaxNumbers floats are 1 MiB.
const (
	HeaderBytes = 24
	MaxControl  = 1 << 16
	MaxNumbers  = 1 << 17
	MaxBytes    = HeaderBytes + MaxControl + 8*MaxNumbers
)

const (
	magic = 'r' | 's'<<8 | 'f'<<16 | '1'<<24
	more  = 1
)

// Frame is a message, or part of one, to be sent. Its slices are read until
// Marshal has returned.
type Frame struct {
	Control []byte
	Floats  []float64
	Ints    []int32
	More    bool // further frames of the same message follow
}

// Bytes is the length of f on the wire.
func (f *Frame) Bytes() int {
	return HeaderBytes + len(f.Control) + 8*len(f.Floats) + 4*len(f.Ints)
}

// Error says what is wrong with a frame.
type Error struct{ Text string }

func (e *Error) Error() string { return "frame: " + e.Text }

func malformed(format string, values ...any) error {
	return &Error{fmt.Sprintf(format, values...)}
}

// Codec turns frames to bytes and back for gRPC. Its zero value is ready; it
// keeps a few buffers that have been sent.
type Codec struct{ sent pool }

// Name is the content subtype.
func (*Codec) Name() string { return "rowstead-frame" }

// Marshal encodes a *Frame; its slices may change as soon as it has returned.
func (c *Codec) Marshal(v any) (mem.BufferSlice, error) {
	f, ok := v.(*Frame)
	if !ok {
		return nil, malformed("a %T to be sent", v)
	}
	if len(f.Control) > MaxControl || 2*len(f.Floats)+len(f.Ints) > 2*MaxNumbers {
		return nil, malformed("%d bytes of control, %d floats and %d ints do not fit one", len(f.Control), len(f.Floats), len(f.Ints))
	}
	buffer := c.sent.Get(f.Bytes())
	f.encode(*buffer)
	return mem.BufferSlice{mem.NewBuffer(buffer, &c.sent)}, nil
}

// encode fills into, which has the length of f.
func (f *Frame) encode(into []byte) {
	flags := uint32(0)
	if f.More {
		flags = more
	}
	for k, v := range [...]uint32{magic, flags, uint32(len(f.Control)), uint32(len(f.Floats)), uint32(len(f.Ints))} {
		binary.LittleEndian.PutUint32(into[4*k:], v)
	}
	at := HeaderBytes + copy(into[HeaderBytes:], f.Control)
	at += copy(into[at:], bytesOf(f.Floats))
	copy(into[at:], bytesOf(f.Ints))
	swap(into[HeaderBytes+len(f.Control):at], 8)
	swap(into[at:], 4)
	binary.LittleEndian.PutUint32(into[20:], checksum(into))
}

// castagnoli is the table of CRC-32C, for which processors have an instruction.
var castagnoli = crc32.MakeTable(crc32.Castagnoli)

// checksum is the CRC-32C of a whole frame without the field that holds it.
func checksum(b []byte) uint32 {
	return crc32.Update(crc32.Checksum(b[:20], castagnoli), castagnoli, b[HeaderBytes:])
}

// Unmarshal takes a frame apart into a *Received, which holds on to the bytes
// until Free.
func (*Codec) Unmarshal(b mem.BufferSlice, v any) error {
	r, ok := v.(*Received)
	if !ok {
		return malformed("a %T to be received", v)
	}
	return r.parse(b)
}

// keptBuffers is how many sent buffers wait for their next use: two frames on
// their way on each of a few streams.
const keptBuffers = 8

// pool keeps buffers that gRPC has done with.
type pool struct {
	mu   sync.Mutex
	free []*[]byte // guarded by mu
}

// Get returns a buffer of that length, its bytes undefined.
func (p *pool) Get(length int) *[]byte {
	p.mu.Lock()
	defer p.mu.Unlock()
	for k, b := range p.free {
		if cap(*b) >= length && cap(*b) <= 4*length {
			last := len(p.free) - 1
			p.free[k], p.free = p.free[last], p.free[:last]
			*b = (*b)[:length]
			return b
		}
	}
	b := make([]byte, length)
	return &b
}

// Put takes a buffer back; the oldest goes when there are enough.
func (p *pool) Put(b *[]byte) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if len(p.free) == keptBuffers {
		p.free = append(p.free[:0], p.free[1:]...)
	}
	p.free = append(p.free, b)
}
