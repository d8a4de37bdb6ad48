package matfile

import (
	"bytes"
	"io"
)

// openFormat tells the format by its first bytes and opens it.
func openFormat(in *stream, o Options, purpose use) (*Reader, error) {
	start, err := in.in.Peek(64)
	if err != nil && err != io.EOF {
		return nil, in.readError(err, 1)
	}
	if bad := foreign(start); bad != "" {
		return nil, &FileError{Path: in.path, Line: 1, Expected: "a matrix or vector file this program reads", Found: bad}
	}
	switch {
	case hasPrefixFold(start, mmBanner):
		return openMM(in, o, purpose)
	case bytes.HasPrefix(start, []byte(npyMagic)):
		return openNpy(in, purpose)
	case bytes.HasPrefix(start, []byte("PK\x03\x04")), bytes.HasPrefix(start, []byte("PK\x05\x06")):
		return openNpz(in, purpose)
	}
	if start, err = in.in.Peek(min(400, in.in.Size())); err != nil && err != io.EOF {
		return nil, in.readError(err, 1)
	}
	if misspeltBanner(start) {
		return nil, &FileError{Path: in.path, Line: 1, Expected: mmBanner + " as the first word", Found: quote(firstWord(start))}
	}
	if looksBoeing(start) {
		return openHB(in, purpose)
	}
	if text := bytes.TrimLeft(start, " \t\r\n"); len(text) > 0 && bytes.IndexByte([]byte("%#+-.0123456789"), text[0]) >= 0 {
		return openText(in, o, purpose)
	}
	return nil, &FileError{Path: in.path, Line: 1, Expected: "a file that begins with " + mmBanner + ", or another format this program reads", Found: quote(start)}
}

// foreign names what the file is when it is recognisably none of ours.
func foreign(start []byte) string {
	for _, known := range []struct{ magic, name string }{
		{"\xff\xfe", "UTF-16 text; save it as plain ASCII or UTF-8"},
		{"\xfe\xff", "UTF-16 text; save it as plain ASCII or UTF-8"},
		{"\xef\xbb\xbf", "text with a byte order mark; save it without"},
		{"BZh", "a bzip2 file; unpack it, or use .gz or .zst"},
		{"\xfd7zXZ", "an xz file; unpack it, or use .gz or .zst"},
		{"7z\xbc\xaf", "a 7z archive; unpack it"},
		{"\x89HDF", "an HDF5 file"},
		{"MATLAB", "a MAT-file"},
		{"%PDF", "a PDF document"},
	} {
		if bytes.HasPrefix(start, []byte(known.magic)) {
			return known.name
		}
	}
	return ""
}

// misspeltBanner says that the first word is meant to be the banner of a Matrix
// Market file: it begins with the mark of a comment and "matrixm".
func misspeltBanner(start []byte) bool {
	word := firstWord(start)
	return len(word) > 0 && word[0] == '%' && hasPrefixFold(bytes.TrimLeft(word, "%"), "matrixm")
}

func firstWord(start []byte) []byte {
	line, _, _ := bytes.Cut(start, []byte("\n"))
	if words := bytes.Fields(line); len(words) > 0 {
		return words[0]
	}
	return nil
}

func hasPrefixFold(b []byte, prefix string) bool {
	return len(b) >= len(prefix) && bytes.EqualFold(b[:len(prefix)], []byte(prefix))
}

// openMM opens a Matrix Market file.
func openMM(in *stream, o Options, purpose use) (*Reader, error) {
	f, err := readMMHeader(in)
	if err != nil {
		return nil, err
	}
	h := f.head
	expand := expansionOf(h.Symmetry, h.Complex, purpose == asVectors)
	at := lineTracker{lines: f.lines}
	if h.Dense {
		g := &numbers{path: in.path, integer: h.Field == "integer", comments: "%"}
		promise := h.Stored
		if h.Complex {
			g.perLine, promise = 2, 2*promise
		}
		source := &textValues{lineTracker: at, in: in, layout: g, opts: o, promise: promise}
		return &Reader{head: h, body: &denseBody{source: source, order: newWalk(f.rows, f.cols, false, h.Symmetry), isComplex: h.Complex, path: in.path, expand: expand}}, nil
	}
	values := map[string]int{"pattern": 0, "real": 1, "integer": 1, "complex": 2}[h.Field]
	g := &coordinates{path: in.path, rows: f.rows, cols: f.cols, base: 1, values: values, integer: h.Field == "integer", comments: "%", expand: expand}
	return &Reader{head: h, body: &entryBody{lineTracker: at, in: in, layout: g, opts: o, stored: h.Stored}}, nil
}
