package matfile

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
)

// largestWindow bounds what a Zstandard stream may make the inflater hold.
const largestWindow = 128 << 20

// stream is one file open for reading, inflated where it is compressed.
type stream struct {
	path        string
	file        *os.File
	in          *bufio.Reader
	compression string // "", "gzip", "zstd"
	size        int64  // bytes of a plain regular file; −1 where they are not known
	regular     bool   // can be opened again
	inflater    interface{ Close() }
}

// openStream opens path and looks at its first bytes for a compression.
func openStream(path string) (*stream, error) {
	file, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("open matrix file: %w", err)
	}
	s := &stream{path: path, file: file, size: -1}
	stat, err := file.Stat()
	if err == nil && stat.IsDir() {
		err = &FileError{Path: path, Expected: "a file", Found: "a folder"}
	}
	if err != nil {
		file.Close()
		return nil, err
	}
	if stat.Mode().IsRegular() {
		s.size, s.regular = stat.Size(), true
	}
	if err := s.inflate(); err != nil {
		s.close()
		return nil, err
	}
	return s, nil
}

// inflate puts the inflater that the magic bytes ask for between file and in.
func (s *stream) inflate() error {
	raw := bufio.NewReaderSize(s.file, s.bufferSize(256<<10))
	s.in = raw
	magic, err := raw.Peek(4)
	if len(magic) == 0 {
		if err != nil && err != io.EOF {
			return s.readError(err, 0)
		}
		return &FileError{Path: s.path, Expected: "a matrix or vector file", Found: "an empty file"}
	}
	switch {
	case bytes.HasPrefix(magic, []byte{0x1f, 0x8b}):
		z, err := gzip.NewReader(raw)
		if err != nil {
			return s.readError(err, 0)
		}
		s.compression, s.size, s.in = "gzip", -1, bufio.NewReaderSize(z, 64<<10)
	case isZstandard(magic):
		z, err := zstd.NewReader(raw, zstd.WithDecoderConcurrency(1), zstd.WithDecoderLowmem(true), zstd.WithDecoderMaxWindow(largestWindow))
		if err != nil {
			return s.readError(err, 0)
		}
		s.compression, s.size, s.in, s.inflater = "zstd", -1, bufio.NewReaderSize(z, 64<<10), z
	}
	if s.compression != "" {
		if _, err := s.in.Peek(1); err != nil {
			if err == io.EOF {
				return &FileError{Path: s.path, Expected: "a matrix or vector file", Found: "nothing inside the " + s.compression + " file"}
			}
			return s.readError(err, 0)
		}
	}
	return nil
}

// isZstandard knows a data frame and the skippable frames that some packers
// put first. Source: RFC 8878, sections 3.1.1 and 3.1.2.
func isZstandard(magic []byte) bool {
	return bytes.Equal(magic, []byte{0x28, 0xb5, 0x2f, 0xfd}) || len(magic) == 4 && magic[0]&0xf0 == 0x50 && bytes.Equal(magic[1:], []byte{0x2a, 0x4d, 0x18})
}

// mustReopen refuses a pipe where a format takes more than one pass.
func (s *stream) mustReopen(format string) error {
	if s.regular {
		return nil
	}
	return &FileError{Path: s.path, Expected: "a regular file, since " + format + " are read in several passes", Found: "a pipe or device"}
}

// bufferSize is most bytes, or what a small plain file needs.
func (s *stream) bufferSize(most int) int {
	if s.size >= 0 && s.size < int64(most) {
		return max(int(s.size)+1, 64)
	}
	return most
}

// readError says that reading failed: a broken archive is the file's fault.
func (s *stream) readError(err error, line int) error {
	what := "a whole file"
	if s.compression != "" {
		what = "a whole " + s.compression + " file"
	}
	var pathError *os.PathError
	if errors.As(err, &pathError) {
		return fmt.Errorf("read matrix file: %w", err)
	}
	found := "a broken one"
	if errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, io.EOF) {
		found = "a truncated one"
	}
	return &FileError{Path: s.path, Line: line, Expected: what, Found: found, Err: err}
}

// readLine returns the next line without its end, which the next call
// overwrites; io.EOF when there is none.
func (s *stream) readLine(line int) ([]byte, error) {
	var long []byte
	for {
		part, err := s.in.ReadSlice('\n')
		if err == nil || (err == io.EOF && len(long)+len(part) > 0) {
			if long != nil {
				part = append(long, part...)
			}
			return bytes.TrimSuffix(bytes.TrimSuffix(part, []byte("\n")), []byte("\r")), nil
		}
		if err == io.EOF {
			return nil, io.EOF
		}
		if err != bufio.ErrBufferFull {
			return nil, s.readError(err, line)
		}
		long = append(long, part...)
		if len(long) > longestLine {
			return nil, tooLong(s.path, line)
		}
	}
}

func tooLong(path string, line int) *FileError {
	return &FileError{Path: path, Line: line, Expected: fmt.Sprintf("lines of at most %d bytes", longestLine), Found: "a longer one"}
}

func (s *stream) close() error {
	if s.inflater != nil {
		s.inflater.Close()
	}
	return s.file.Close()
}
