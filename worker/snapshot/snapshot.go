// Package snapshot saves and loads what a worker must not lose: its rows of x
// and, if wished, the vectors Z of its recycled space.
//
// Its noun is the State. A file is written whole or not at all: it grows under a
// temporary name in the same folder, reaches the disk and is then renamed. A file
// that was cut short or altered is refused with an error that says so. Rows are
// global. Nothing here may be used on one path by two goroutines at once.
//
// The file, little-endian: the text "rowstead", a uint32 version, a uint32 length
// of what follows up to the checksum of the header; first row and rows (uint64),
// directions (uint32), a uint32 length and the bytes of the run's name, 32 bytes
// hash of the matrix; a CRC-32C of all so far. Then x and the vectors of Z, 8
// bytes a number, and a CRC-32C of these.
package snapshot

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"hash"
	"hash/crc32"
	"io"
	"math"
	"os"
)

// Version is that of the files this package writes and the only one it reads.
const Version = 1

const (
	magic       = "rowstead"
	prefixSize  = len(magic) + 8
	fixedSize   = 8 + 8 + 4 + 4 + 32
	longestRun  = 4096
	mostVectors = 1 << 16
)

// ErrDamaged is wrapped by the errors of Load about files that were cut short or
// altered.
var ErrDamaged = errors.New("the snapshot is damaged")

// State is one row block's part of a snapshot.
type State struct {
	Run      string   // the run's name, at most 4096 bytes
	Matrix   [32]byte // hash of the matrix, so that a changed input is noticed
	FirstRow int
	X        []float64   // the block's rows of x
	Z        [][]float64 // recycled vectors, each as long as X; may be empty
}

// Save writes s to path, over any older snapshot there, atomically. On an error
// the older file is as it was and no temporary file is left.
func Save(path string, s State) error {
	header, err := s.header()
	if err != nil {
		return fmt.Errorf("snapshot %s: %w", path, err)
	}
	err = replace(path, func(w io.Writer) error {
		if _, err := w.Write(header); err != nil {
			return err
		}
		sum := crc32.New(castagnoli())
		for _, v := range append([][]float64{s.X}, s.Z...) {
			if err := writeFloats(io.MultiWriter(w, sum), v); err != nil {
				return err
			}
		}
		_, err := w.Write(binary.LittleEndian.AppendUint32(nil, sum.Sum32()))
		return err
	})
	if err != nil {
		return fmt.Errorf("snapshot %s: %w", path, err)
	}
	return nil
}

func castagnoli() *crc32.Table { return crc32.MakeTable(crc32.Castagnoli) }

func (s State) header() ([]byte, error) {
	if len(s.Run) > longestRun {
		return nil, fmt.Errorf("the run's name has %d bytes, at most %d fit", len(s.Run), longestRun)
	}
	if s.FirstRow < 0 || len(s.Z) > mostVectors {
		return nil, fmt.Errorf("first row %d, %d recycled vectors", s.FirstRow, len(s.Z))
	}
	for i, z := range s.Z {
		if len(z) != len(s.X) {
			return nil, fmt.Errorf("recycled vector %d has %d rows, x has %d", i, len(z), len(s.X))
		}
	}
	le := binary.LittleEndian
	h := le.AppendUint32([]byte(magic), Version)
	h = le.AppendUint32(h, uint32(fixedSize+len(s.Run)))
	h = le.AppendUint64(h, uint64(s.FirstRow))
	h = le.AppendUint64(h, uint64(len(s.X)))
	h = le.AppendUint32(h, uint32(len(s.Z)))
	h = le.AppendUint32(h, uint32(len(s.Run)))
	h = append(h, s.Run...)
	h = append(h, s.Matrix[:]...)
	return le.AppendUint32(h, crc32.Checksum(h, castagnoli())), nil
}

// Load reads a snapshot. Memory is promised to it only after its header is
// proven and the file is as long as the header says.
func Load(path string) (State, error) {
	f, err := os.Open(path)
	if err != nil {
		return State{}, fmt.Errorf("snapshot: %w", err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return State{}, fmt.Errorf("snapshot: %w", err)
	}
	s, err := read(f, info.Size())
	if err != nil {
		return State{}, fmt.Errorf("snapshot %s: %w", path, err)
	}
	return s, nil
}

// read reads a snapshot of size bytes from r.
func read(r io.Reader, size int64) (State, error) {
	s, rows, directions, headerSize, err := readHeader(r, size)
	if err != nil {
		return State{}, err
	}
	vectors := 1 + uint64(directions)
	payload := size - int64(headerSize) - 4
	if payload < 0 || payload%8 != 0 || rows > math.MaxInt64/8/vectors || uint64(payload) != 8*rows*vectors {
		return State{}, fmt.Errorf("%w: %d bytes, expected %d vectors of %d rows", ErrDamaged, size, vectors, rows)
	}
	sum := crc32.New(castagnoli())
	for v := range vectors {
		floats := make([]float64, rows)
		if err := readFloats(r, floats, sum); err != nil {
			return State{}, damaged(err)
		}
		if v == 0 {
			s.X = floats
			continue
		}
		s.Z = append(s.Z, floats)
	}
	var tail [4]byte
	if _, err := io.ReadFull(r, tail[:]); err != nil {
		return State{}, damaged(err)
	}
	if got := binary.LittleEndian.Uint32(tail[:]); got != sum.Sum32() {
		return State{}, fmt.Errorf("%w: the checksum of its numbers is %08x, expected %08x", ErrDamaged, sum.Sum32(), got)
	}
	return s, nil
}

// readHeader reads and proves the header; size is that of the whole file.
func readHeader(r io.Reader, size int64) (s State, rows uint64, directions uint32, n int, err error) {
	le := binary.LittleEndian
	header := make([]byte, prefixSize)
	if _, err := io.ReadFull(r, header); err != nil {
		return s, 0, 0, 0, damaged(err)
	}
	if !bytes.Equal(header[:len(magic)], []byte(magic)) {
		return s, 0, 0, 0, errors.New("this is no snapshot")
	}
	if v := le.Uint32(header[len(magic):]); v != Version {
		return s, 0, 0, 0, fmt.Errorf("version %d, expected %d", v, Version)
	}
	rest := int(le.Uint32(header[len(magic)+4:]))
	if rest < fixedSize || rest > fixedSize+longestRun || int64(prefixSize+rest+4) > size {
		return s, 0, 0, 0, fmt.Errorf("%w: a header of %d bytes in a file of %d", ErrDamaged, prefixSize+rest+4, size)
	}
	header = append(header, make([]byte, rest+4)...)
	if _, err := io.ReadFull(r, header[prefixSize:]); err != nil {
		return s, 0, 0, 0, damaged(err)
	}
	body, sum := header[:prefixSize+rest], le.Uint32(header[prefixSize+rest:])
	if got := crc32.Checksum(body, castagnoli()); got != sum {
		return s, 0, 0, 0, fmt.Errorf("%w: the checksum of its header is %08x, expected %08x", ErrDamaged, got, sum)
	}
	f := body[prefixSize:]
	first, run := le.Uint64(f), int(le.Uint32(f[20:]))
	rows, directions = le.Uint64(f[8:]), le.Uint32(f[16:])
	if run != rest-fixedSize || first > math.MaxInt64 || directions > mostVectors {
		return s, 0, 0, 0, fmt.Errorf("%w: its header contradicts itself", ErrDamaged)
	}
	s.FirstRow, s.Run = int(first), string(f[24:24+run])
	copy(s.Matrix[:], f[24+run:])
	return s, rows, directions, len(header), nil
}

// damaged says that a file ended too soon; other errors pass.
func damaged(err error) error {
	if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
		return fmt.Errorf("%w: it ends too soon", ErrDamaged)
	}
	return err
}

const chunk = 1 << 13 // numbers at once, 64 KiB

func writeFloats(w io.Writer, v []float64) error {
	buffer := make([]byte, 8*min(chunk, len(v)))
	for len(v) > 0 {
		n := min(chunk, len(v))
		for i, x := range v[:n] {
			binary.LittleEndian.PutUint64(buffer[8*i:], math.Float64bits(x))
		}
		if _, err := w.Write(buffer[:8*n]); err != nil {
			return err
		}
		v = v[n:]
	}
	return nil
}

func readFloats(r io.Reader, v []float64, sum hash.Hash32) error {
	buffer := make([]byte, 8*min(chunk, len(v)))
	for len(v) > 0 {
		n := min(chunk, len(v))
		if _, err := io.ReadFull(r, buffer[:8*n]); err != nil {
			return err
		}
		sum.Write(buffer[:8*n])
		for i := range n {
			v[i] = math.Float64frombits(binary.LittleEndian.Uint64(buffer[8*i:]))
		}
		v = v[n:]
	}
	return nil
}
