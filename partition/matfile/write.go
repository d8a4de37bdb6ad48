package matfile

import (
	"fmt"
	"io"
	"path/filepath"
	"strconv"
	"strings"

	"rowstead/partition/csr"
)

// digitsBehindPoint makes 17 significant digits, which give a float64 back to
// the last bit.
const digitsBehindPoint = 16

// WriteDense writes vectors as a Matrix Market array, or as a NumPy array where
// the name ends in .npy, compressed where .gz or .zst follows. Values must be
// finite.
func WriteDense(path string, d *Dense, w WriteOptions) error {
	if len(d.Values) != d.Rows*d.Cols || d.Complex && d.Rows%2 != 0 {
		panic("matfile: WriteDense: values do not fit rows and columns")
	}
	for k, v := range d.Values {
		if !finite(v) {
			return fmt.Errorf("write %s: row %d, column %d is %v, not a finite number", path, k%d.Rows+1, k/d.Rows+1, v)
		}
	}
	fill := func(out io.Writer) error { return denseText(out, d, w.Comment) }
	if strings.HasSuffix(plainName(path), ".npy") {
		fill = func(out io.Writer) error { return denseNpy(out, d) }
	}
	return writeWhole(realDisk{}, path, w, fill)
}

// plainName is path in lower case without the ending of a compression.
func plainName(path string) string {
	name := strings.ToLower(path)
	if compressionOf(name) != "" {
		name = strings.TrimSuffix(name, filepath.Ext(name))
	}
	return name
}

// denseText writes a Matrix Market array.
func denseText(out io.Writer, d *Dense, comment []string) error {
	t := textWriter{out: out}
	field, perLine := "real", 1
	if d.Complex {
		field, perLine = "complex", 2
	}
	t.banner("array", field, "general", comment)
	t.text(fmt.Sprintf("%d %d\n", d.Rows/perLine, d.Cols))
	for k := 0; k < len(d.Values); k += perLine {
		t.float(d.Values[k])
		if d.Complex {
			t.text(" ")
			t.float(d.Values[k+1])
		}
		t.text("\n")
	}
	return t.flush()
}

// WriteMatrix writes a matrix as Matrix Market coordinate real general, row by
// row, duplicates impossible, 17 significant digits.
func WriteMatrix(path string, m *csr.Matrix, w WriteOptions) error {
	h := Header{Rows: m.Rows, Cols: m.Cols, Stored: int64(m.Entries()), Symmetry: "general"}
	return WriteMatrixStream(path, h, w, func(put func(i, j int, v float64) error) error {
		for i := range m.Rows {
			cols, vals := m.Row(i)
			for k, c := range cols {
				if err := put(i, int(c), vals[k]); err != nil {
					return err
				}
			}
		}
		return nil
	})
}

// WriteMatrixStream writes a Matrix Market coordinate file whose entries come
// from fill, which calls put for each in the order to be written, zero-based,
// and hands on put's error. Of h it uses Rows, Cols, Stored and Symmetry
// ("general" when empty, "symmetric" or "skew-symmetric" with the lower triangle
// alone). More or fewer entries than h.Stored, one outside, or a value that is
// not finite is an error, and no file is written.
func WriteMatrixStream(path string, h Header, w WriteOptions, fill func(put func(i, j int, v float64) error) error) error {
	return writeWhole(realDisk{}, path, w, func(out io.Writer) error {
		s := entryWriter{textWriter: textWriter{out: out}, head: h}
		if s.head.Symmetry == "" {
			s.head.Symmetry = "general"
		}
		s.banner("coordinate", "real", s.head.Symmetry, w.Comment)
		s.text(fmt.Sprintf("%d %d %d\n", h.Rows, h.Cols, h.Stored))
		if err := fill(s.put); err != nil {
			return err
		}
		if s.count != h.Stored {
			return fmt.Errorf("%d entries were given, %d announced", s.count, h.Stored)
		}
		return s.flush()
	})
}

// entryWriter checks and writes the entries of a coordinate file.
type entryWriter struct {
	textWriter
	head  Header
	count int64
}

func (s *entryWriter) put(i, j int, v float64) error {
	lower := s.head.Symmetry == "general" || i > j || i == j && (s.head.Symmetry == "symmetric" || v == 0)
	switch {
	case i < 0 || i >= s.head.Rows || j < 0 || j >= s.head.Cols:
		return fmt.Errorf("entry (%d, %d) lies outside a %d by %d matrix", i+1, j+1, s.head.Rows, s.head.Cols)
	case !lower:
		return fmt.Errorf("entry (%d, %d) does not belong in a %s file", i+1, j+1, s.head.Symmetry)
	case !finite(v):
		return fmt.Errorf("entry (%d, %d) is %v, not a finite number", i+1, j+1, v)
	case s.count == s.head.Stored:
		return fmt.Errorf("more entries are given than the %d announced", s.head.Stored)
	}
	s.count++
	s.buffer = strconv.AppendInt(s.buffer, int64(i)+1, 10)
	s.buffer = append(s.buffer, ' ')
	s.buffer = strconv.AppendInt(s.buffer, int64(j)+1, 10)
	s.buffer = append(s.buffer, ' ')
	s.float(v)
	s.text("\n")
	return s.err
}

// textWriter gathers text and remembers the first error.
type textWriter struct {
	out    io.Writer
	buffer []byte
	err    error
}

// banner writes the Matrix Market banner and the comments, each line of which
// gets its mark.
func (t *textWriter) banner(layout, field, symmetry string, comment []string) {
	t.text(fmt.Sprintf("%s matrix %s %s %s\n", mmBanner, layout, field, symmetry))
	for _, c := range comment {
		for line := range strings.Lines(c + "\n") {
			if line = strings.TrimRight(line, "\r\n"); line != "" {
				t.text("% " + line + "\n")
			}
		}
	}
}

func (t *textWriter) float(v float64) {
	t.buffer = strconv.AppendFloat(t.buffer, v, 'e', digitsBehindPoint, 64)
}

func (t *textWriter) text(s string) {
	t.buffer = append(t.buffer, s...)
	if len(t.buffer) >= 32<<10 {
		t.flush()
	}
}

func (t *textWriter) flush() error {
	if t.err == nil {
		_, t.err = t.out.Write(t.buffer)
	}
	t.buffer = t.buffer[:0]
	return t.err
}
