package frame

import (
	"encoding/binary"
	"hash/crc32"

	"google.golang.org/grpc/mem"
)

// Received is a frame that came and has been checked.
type Received struct {
	Control      []byte
	Floats, Ints int  // how many there are
	More         bool // further frames of the same message follow
	body         mem.BufferSlice
}

// Bytes is the length of r on the wire.
func (r *Received) Bytes() int {
	return HeaderBytes + len(r.Control) + 8*r.Floats + 4*r.Ints
}

// parse checks b and keeps it.
func (r *Received) parse(b mem.BufferSlice) error {
	length := b.Len()
	if length < HeaderBytes || length > MaxBytes {
		return malformed("%d bytes, expected %d to %d", length, HeaderBytes, MaxBytes)
	}
	var header [HeaderBytes]byte
	copyFrom(header[:], b, 0)
	field := func(k int) int64 { return int64(binary.LittleEndian.Uint32(header[4*k:])) }
	control, floats, ints := field(2), field(3), field(4)
	switch {
	case field(0) != magic:
		return malformed("it does not begin with rsf1")
	case field(1) > more:
		return malformed("unknown flags %x", field(1))
	case control > MaxControl || 2*floats+ints > 2*MaxNumbers:
		return malformed("%d bytes of control, %d floats and %d ints are too many", control, floats, ints)
	case HeaderBytes+control+8*floats+4*ints != int64(length):
		return malformed("%d bytes came, its header says %d", length, HeaderBytes+control+8*floats+4*ints)
	case sumOf(b) != uint32(field(5)):
		return malformed("the checksum is wrong")
	}
	r.Control = make([]byte, control)
	copyFrom(r.Control, b, HeaderBytes)
	r.Floats, r.Ints, r.More = int(floats), int(ints), field(1) == more
	b.Ref()
	r.body = b
	return nil
}

// sumOf is the checksum of a frame in pieces: all bytes but [20, 24).
func sumOf(b mem.BufferSlice) uint32 {
	sum, at := uint32(0), 0
	for _, piece := range b {
		data := piece.ReadOnlyData()
		head := data[:min(len(data), max(0, 20-at))]
		tail := data[min(len(data), max(0, HeaderBytes-at)):]
		sum = crc32.Update(crc32.Update(sum, castagnoli, head), castagnoli, tail)
		at += len(data)
	}
	return sum
}

// copyFrom fills into with the bytes of b from offset on, of which there are
// enough.
func copyFrom(into []byte, b mem.BufferSlice, offset int) {
	for _, piece := range b {
		if len(into) == 0 {
			return
		}
		if offset >= piece.Len() {
			offset -= piece.Len()
			continue
		}
		into = into[copy(into, piece.ReadOnlyData()[offset:]):]
		offset = 0
	}
}

// CopyFloats copies the first floats to into, which must not be longer than
// Floats. It panics after Free.
func (r *Received) CopyFloats(into []float64) {
	if len(into) > r.Floats || (r.body == nil && len(into) > 0) {
		panic("frame: more floats asked for than there are")
	}
	b := bytesOf(into)
	copyFrom(b, r.body, HeaderBytes+len(r.Control))
	swap(b, 8)
}

// CopyInts copies the first ints to into, which must not be longer than Ints. It
// panics after Free.
func (r *Received) CopyInts(into []int32) {
	if len(into) > r.Ints || (r.body == nil && len(into) > 0) {
		panic("frame: more ints asked for than there are")
	}
	b := bytesOf(into)
	copyFrom(b, r.body, HeaderBytes+len(r.Control)+8*r.Floats)
	swap(b, 4)
}

// Free lets go of the bytes; the control part stays.
func (r *Received) Free() {
	r.body.Free()
	r.body = nil
}
