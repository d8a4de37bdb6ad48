package frame

import (
	"bytes"
	"encoding/binary"
	"encoding/hex"
	"math"
	"slices"
	"testing"

	"google.golang.org/grpc/mem"
	"pgregory.net/rapid"
)

// pieces cuts b as a connection might.
func pieces(b []byte, at ...int) mem.BufferSlice {
	var s mem.BufferSlice
	last := 0
	for _, k := range at {
		s = append(s, mem.SliceBuffer(b[last:k]))
		last = k
	}
	return append(s, mem.SliceBuffer(b[last:]))
}

func encoded(t testing.TB, c *Codec, f *Frame) []byte {
	t.Helper()
	b, err := c.Marshal(f)
	if err != nil {
		t.Fatal(err)
	}
	defer b.Free()
	return slices.Clone(b.Materialize())
}

// Whatever is sent, and however the bytes are cut on the way, the same arrives.
func TestRoundTrip(t *testing.T) {
	var c Codec
	rapid.Check(t, func(t *rapid.T) {
		f := &Frame{
			Control: rapid.SliceOfN(rapid.Byte(), 0, 70).Draw(t, "control"),
			Ints:    rapid.SliceOfN(rapid.Int32(), 0, 40).Draw(t, "ints"),
			More:    rapid.Bool().Draw(t, "more"),
		}
		for _, bits := range rapid.SliceOfN(rapid.Uint64(), 0, 500).Draw(t, "floats") {
			f.Floats = append(f.Floats, math.Float64frombits(bits))
		}
		b, err := c.Marshal(f)
		if err != nil {
			t.Fatal(err)
		}
		whole := b.Materialize()
		cuts := rapid.SliceOfN(rapid.IntRange(0, len(whole)), 0, 4).Draw(t, "cuts")
		slices.Sort(cuts)
		var r Received
		if err := c.Unmarshal(pieces(whole, cuts...), &r); err != nil {
			t.Fatal(err)
		}
		b.Free()
		floats, ints := make([]float64, r.Floats), make([]int32, r.Ints)
		r.CopyFloats(floats)
		r.CopyInts(ints)
		same := slices.EqualFunc(floats, f.Floats, func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) })
		if !same || !slices.Equal(ints, f.Ints) || !bytes.Equal(r.Control, f.Control) || r.More != f.More || r.Bytes() != f.Bytes() {
			t.Fatalf("sent %+v, came %+v with %v, %v", f, r, floats, ints)
		}
		r.Free()
	})
}

// The bytes are those of the package comment, put down by hand; the checksum of
// "123456789" under CRC-32C is the published check value 0xE3069283.
func TestBytesOfAFrame(t *testing.T) {
	got := encoded(t, &Codec{}, &Frame{Control: []byte("ab"), Floats: []float64{1}, Ints: []int32{-2}, More: true})
	want := "72736631" + "01000000" + "02000000" + "01000000" + "01000000" + hex.EncodeToString(got[20:24]) + "6162" + "000000000000f03f" + "feffffff"
	if hex.EncodeToString(got) != want {
		t.Errorf("frame %x, want %s", got, want)
	}
	if sum := binary.LittleEndian.Uint32(got[20:]); sum != checksum(got) {
		t.Errorf("checksum %x, want %x", sum, checksum(got))
	}
	if sum := sumOf(pieces([]byte("123456789"))); sum != 0xE3069283 {
		t.Errorf("CRC-32C of 123456789 is %x", sum)
	}
}

func TestEveryDamageIsRefused(t *testing.T) {
	good := encoded(t, &Codec{}, &Frame{Control: []byte("control"), Floats: []float64{1, 2, 3}, Ints: []int32{4}})
	var r Received
	for k := range good {
		for bit := range 8 {
			bad := slices.Clone(good)
			bad[k] ^= 1 << bit
			if err := (&Codec{}).Unmarshal(pieces(bad), &r); err == nil {
				t.Errorf("bit %d of byte %d turned: no error", bit, k)
			}
		}
	}
	for k := range good {
		if err := (&Codec{}).Unmarshal(pieces(good[:k]), &r); err == nil {
			t.Errorf("only %d bytes: no error", k)
		}
	}
	if err := (&Codec{}).Unmarshal(pieces(append(good, 0)), &r); err == nil {
		t.Error("a byte too many: no error")
	}
}

// A header that promises more than is allowed, with a right checksum.
func TestBoundsAreCheckedFirst(t *testing.T) {
	for name, fields := range map[string][3]uint32{
		"control": {MaxControl + 1, 0, 0}, "floats": {0, MaxNumbers + 1, 0}, "ints": {0, 0, 2*MaxNumbers + 1},
		"both": {0, MaxNumbers, 1}, "all": {math.MaxUint32, math.MaxUint32, math.MaxUint32},
	} {
		b := encoded(t, &Codec{}, &Frame{})
		for k, v := range fields {
			binary.LittleEndian.PutUint32(b[8+4*k:], v)
		}
		binary.LittleEndian.PutUint32(b[20:], checksum(b))
		grown := testing.AllocsPerRun(10, func() {
			var r Received
			if err := (&Codec{}).Unmarshal(pieces(b), &r); err == nil {
				t.Errorf("too many %s: no error", name)
			}
		})
		if grown > 20 {
			t.Errorf("too many %s: %v allocations", name, grown)
		}
	}
	for _, f := range []*Frame{{Control: make([]byte, MaxControl+1)}, {Floats: make([]float64, MaxNumbers+1)}, {Floats: make([]float64, MaxNumbers), Ints: make([]int32, 1)}} {
		if _, err := (&Codec{}).Marshal(f); err == nil {
			t.Errorf("a frame of %d bytes is sent", f.Bytes())
		}
	}
	if b := encoded(t, &Codec{}, &Frame{Control: make([]byte, MaxControl), Floats: make([]float64, MaxNumbers)}); len(b) != MaxBytes {
		t.Errorf("the largest frame has %d bytes, want %d", len(b), MaxBytes)
	}
}

func TestReverseTurnsNumbers(t *testing.T) {
	b := []byte{1, 2, 3, 4, 5, 6, 7, 8}
	reverse(b, 4)
	if !bytes.Equal(b, []byte{4, 3, 2, 1, 8, 7, 6, 5}) {
		t.Errorf("reverse by 4: %v", b)
	}
	reverse(b, 8)
	if !bytes.Equal(b, []byte{5, 6, 7, 8, 1, 2, 3, 4}) {
		t.Errorf("reverse by 8: %v", b)
	}
}

// A buffer is used again only after gRPC has let go of it.
func TestBuffersComeBack(t *testing.T) {
	var c Codec
	f := &Frame{Floats: make([]float64, 1000)}
	first, _ := c.Marshal(f)
	second, _ := c.Marshal(f)
	if &first[0].ReadOnlyData()[0] == &second[0].ReadOnlyData()[0] {
		t.Error("a buffer in use was given out again")
	}
	mine := &first[0].ReadOnlyData()[0]
	first.Free()
	if third, _ := c.Marshal(f); &third[0].ReadOnlyData()[0] != mine {
		t.Error("a buffer that came back was not used")
	}
	for range 3 * keptBuffers {
		c.sent.Put(new([]byte))
	}
	if len(c.sent.free) > keptBuffers {
		t.Errorf("%d buffers are kept", len(c.sent.free))
	}
}

// Whatever comes, a frame is either refused or is the one encoding of itself.
func FuzzUnmarshal(f *testing.F) {
	var c Codec
	f.Add([]byte{}, 0)
	f.Add(encoded(f, &c, &Frame{Control: []byte("x"), Floats: []float64{1, math.NaN()}, Ints: []int32{7}, More: true}), 9)
	f.Add(encoded(f, &c, &Frame{}), 24)
	f.Fuzz(func(t *testing.T, b []byte, cut int) {
		var r Received
		if len(b) >= HeaderBytes { // a right checksum, so that more than it is tried
			binary.LittleEndian.PutUint32(b[20:], checksum(b))
		}
		if c.Unmarshal(pieces(b, max(0, min(cut, len(b)))), &r) != nil {
			return
		}
		again := &Frame{Control: r.Control, Floats: make([]float64, r.Floats), Ints: make([]int32, r.Ints), More: r.More}
		r.CopyFloats(again.Floats)
		r.CopyInts(again.Ints)
		if !bytes.Equal(encoded(t, &c, again), b) {
			t.Fatalf("%x was accepted, but it is %x", b, encoded(t, &c, again))
		}
	})
}

func BenchmarkEncode80KiB(b *testing.B) {
	var c Codec
	f := &Frame{Control: []byte{1, 2, 3}, Floats: make([]float64, 10<<10)}
	b.SetBytes(80 << 10)
	for b.Loop() {
		s, err := c.Marshal(f)
		if err != nil {
			b.Fatal(err)
		}
		s.Free()
	}
}

func BenchmarkDecode80KiB(b *testing.B) {
	var c Codec
	whole := encoded(b, &c, &Frame{Floats: make([]float64, 10<<10)})
	into := make([]float64, 10<<10)
	b.SetBytes(80 << 10)
	for b.Loop() {
		var r Received
		if err := c.Unmarshal(pieces(whole, 16<<10, 32<<10), &r); err != nil {
			b.Fatal(err)
		}
		r.CopyFloats(into)
		r.Free()
	}
}
