package records

import (
	"bufio"
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/json"
	"errors"
	"fmt"
	"hash"
	"io"
	"math"
	"os"
	"path/filepath"
)

// snapshotMagic begins every snapshot; the digit is the layout's version.
const snapshotMagic = "rowstead snapshot 1\n"

// Snapshot is the answer so far, in the order and units of the files.
type Snapshot struct {
	Done int         // right sides that are finished; the next one is begun
	X    [][]float64 // one a right side, all of one length
}

// snapshotHead is the second line of the file.
type snapshotHead struct {
	Done, Columns, Rows int
}

// SaveSnapshot replaces the run's snapshot. Layout: the magic line, a line of
// JSON with the sizes, the values as little-endian 64-bit floats column by
// column, and the SHA-256 of all before it.
func (r Run) SaveSnapshot(s Snapshot) error {
	return r.pending.Write(r.snapshotPath(), true, func(w io.Writer) error {
		sum := sha256.New()
		both := io.MultiWriter(w, sum)
		head := snapshotHead{Done: s.Done, Columns: len(s.X)}
		if len(s.X) > 0 {
			head.Rows = len(s.X[0])
		}
		text, err := json.Marshal(head)
		if err != nil {
			return err
		}
		if _, err := fmt.Fprintf(both, "%s%s\n", snapshotMagic, text); err != nil {
			return err
		}
		for _, x := range s.X {
			if err := writeFloats(both, x); err != nil {
				return err
			}
		}
		_, err = w.Write(sum.Sum(nil))
		return err
	})
}

// chunk is how many floats are converted at a time.
const chunk = 8192

func writeFloats(w io.Writer, x []float64) error {
	buffer := make([]byte, 0, 8*chunk)
	for len(x) > 0 {
		n := min(chunk, len(x))
		buffer = buffer[:0]
		for _, v := range x[:n] {
			buffer = binary.LittleEndian.AppendUint64(buffer, math.Float64bits(v))
		}
		if _, err := w.Write(buffer); err != nil {
			return err
		}
		x = x[n:]
	}
	return nil
}

// ErrNoSnapshot says that a run has none.
var ErrNoSnapshot = errors.New("the run has no snapshot")

// errDamaged is what a snapshot with a wrong checksum gives.
var errDamaged = errors.New("the snapshot is damaged")

// LoadSnapshot reads the snapshot. The sizes are compared with the file's length
// before any memory is promised to them.
func (r Run) LoadSnapshot() (Snapshot, error) {
	f, err := os.Open(r.snapshotPath())
	if errors.Is(err, os.ErrNotExist) {
		return Snapshot{}, ErrNoSnapshot
	}
	if err != nil {
		return Snapshot{}, err
	}
	defer f.Close() // read only
	status, err := f.Stat()
	if err != nil {
		return Snapshot{}, err
	}
	s, err := readSnapshot(f, status.Size())
	if err != nil {
		return Snapshot{}, fmt.Errorf("%s: %w", r.snapshotPath(), err)
	}
	return s, nil
}

func readSnapshot(f io.Reader, size int64) (Snapshot, error) {
	sum := sha256.New()
	in := bufio.NewReaderSize(f, bufferBytes)
	magic, err := in.ReadString('\n')
	if err != nil || magic != snapshotMagic {
		return Snapshot{}, errDamaged
	}
	text, err := in.ReadBytes('\n')
	if err != nil {
		return Snapshot{}, errDamaged
	}
	sum.Write([]byte(magic))
	sum.Write(text)
	var head snapshotHead
	if json.Unmarshal(text, &head) != nil || head.Rows < 0 || head.Columns < 0 || head.Done < 0 || head.Done > head.Columns {
		return Snapshot{}, errDamaged
	}
	rest := float64(size) - float64(len(magic)+len(text)+sha256.Size)
	if rest != 8*float64(head.Rows)*float64(head.Columns) {
		return Snapshot{}, errDamaged
	}
	s := Snapshot{Done: head.Done, X: make([][]float64, head.Columns)}
	for j := range s.X {
		s.X[j] = make([]float64, head.Rows)
		if err := readFloats(in, sum, s.X[j]); err != nil {
			return Snapshot{}, errDamaged
		}
	}
	want := make([]byte, sha256.Size)
	if _, err := io.ReadFull(in, want); err != nil || !bytes.Equal(want, sum.Sum(nil)) {
		return Snapshot{}, errDamaged
	}
	return s, nil
}

// bufferBytes is the size of the read buffer.
const bufferBytes = 1 << 20

func readFloats(in io.Reader, sum hash.Hash, x []float64) error {
	buffer := make([]byte, 8*chunk)
	for len(x) > 0 {
		n := min(chunk, len(x))
		part := buffer[:8*n]
		if _, err := io.ReadFull(in, part); err != nil {
			return err
		}
		sum.Write(part)
		for i := range n {
			x[i] = math.Float64frombits(binary.LittleEndian.Uint64(part[8*i:]))
		}
		x = x[n:]
	}
	return nil
}

// DropSnapshot removes the snapshot of a run that needs none any more.
func (r Run) DropSnapshot() error {
	err := os.Remove(r.snapshotPath())
	if errors.Is(err, os.ErrNotExist) {
		return nil
	}
	return err
}

func (r Run) snapshotPath() string { return filepath.Join(r.Folder, snapshotFile) }
