package matfile

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"math"
)

// textMarks begin a comment line in text without a banner.
const textMarks = "%#"

// openText opens text without a banner: lines "i j v" (or "i j re im") as a
// matrix, a table of numbers as vectors.
func openText(in *stream, o Options, purpose use) (*Reader, error) {
	lines, words, err := firstRow(in)
	if err != nil {
		return nil, err
	}
	if purpose == asVectors && (o.IndexBase == UnknownBase || words != 3 && words != 4) {
		return openList(in, o, lines, words)
	}
	if words != 3 && words != 4 {
		return nil, &FileError{Path: in.path, Line: lines + 1, Expected: "lines of row, column and value (or real and imaginary part), or a file that begins with " + mmBanner, Found: fmt.Sprintf("%d words on the line", words)}
	}
	return openTriplets(in, o, words-2, purpose)
}

// firstRow skips comments and blank lines and counts the words of the first
// other line, which stays unread; lines is how many were skipped.
func firstRow(in *stream) (lines, words int, err error) {
	for {
		line, err := in.readLine(lines + 1)
		if err == io.EOF {
			return 0, 0, &FileError{Path: in.path, Line: lines, Expected: "a line of numbers", Found: "the end of the file"}
		}
		if err != nil {
			return 0, 0, err
		}
		text := bytes.TrimSpace(line)
		if len(text) > 0 && bytes.IndexByte([]byte(textMarks), text[0]) < 0 {
			again := append(append([]byte(nil), line...), '\n')
			in.in = bufio.NewReaderSize(io.MultiReader(bytes.NewReader(again), in.in), in.bufferSize(64<<10))
			return lines, len(bytes.Fields(text)), nil
		}
		lines++
		if hasPrefixFold(text, mmBanner) {
			return 0, 0, &FileError{Path: in.path, Line: lines, Expected: mmBanner + " as the very first bytes of the file", Found: "it behind others"}
		}
	}
}

// openList opens a table of numbers, a line a row, as vectors.
func openList(in *stream, o Options, lines, words int) (*Reader, error) {
	h := Header{Path: in.path, Format: "numbers", Layout: "array", Compression: in.compression, Field: "real", Symmetry: "general", Cols: words, Dense: true}
	source := &textValues{lineTracker: lineTracker{lines: lines}, in: in, opts: o, promise: -1,
		layout: &numbers{path: in.path, perLine: words, comments: textMarks}}
	return &Reader{head: h, body: &denseBody{source: source, order: newWalk(math.MaxInt32, words, true, "general"), path: in.path, expand: expansionOf("general", false, true)}}, nil
}

// openTriplets reads the file once for its size and base and prepares the
// second pass.
func openTriplets(in *stream, o Options, values int, purpose use) (*Reader, error) {
	if err := in.mustReopen("triplets without a header"); err != nil {
		return nil, err
	}
	span, err := spanTriplets(in.path, o, values)
	if err != nil {
		return nil, err
	}
	base := 0
	switch {
	case o.IndexBase == OneBased:
		base = 1
	case o.IndexBase == UnknownBase && span.least > 0:
		return nil, &FileError{Path: in.path, Expected: "to be told whether rows and columns count from 0 or 1, which the file leaves open",
			Found: fmt.Sprintf("indices from %d", span.least), Flag: "--index-base 1 (or 0)"}
	}
	h := Header{Path: in.path, Format: "triplets", Layout: "coordinate", Compression: in.compression, Field: "real", Symmetry: "general", Stored: span.count}
	if h.Complex = values == 2; h.Complex {
		h.Field = "complex"
	}
	rows, cols := span.rows, span.cols // counted from the base
	if err := h.setShape(int64(rows), int64(cols), 0); err != nil {
		return nil, err
	}
	second, err := openStream(in.path)
	if err != nil {
		return nil, err
	}
	in.close()
	g := &coordinates{path: in.path, rows: rows, cols: cols, base: base, values: values, comments: textMarks, expand: expansionOf("general", h.Complex, purpose == asVectors)}
	return &Reader{head: h, body: &entryBody{in: second, layout: g, opts: o, stored: span.count}}, nil
}

// tripletSpan is what the first pass over triplets tells, indices without the
// base given (0 where it is unknown).
type tripletSpan struct {
	least      int32 // smallest index
	rows, cols int   // how many, counted from the base given
	count      int64
}

// spanTriplets reads all triplets once.
func spanTriplets(path string, o Options, values int) (s tripletSpan, err error) {
	in, err := openStream(path)
	if err != nil {
		return s, err
	}
	g := &coordinates{path: path, rows: math.MaxInt32, cols: math.MaxInt32, values: values, comments: textMarks, expand: expansion{most: 1, put: putReal}}
	if o.IndexBase == OneBased {
		g.base = 1
	}
	pipe := newPipeline(in, o, g.parse)
	defer closePipe(pipe, in)
	at := lineTracker{}
	s.least = math.MaxInt32
	for {
		c, err := at.take(pipe)
		if err == io.EOF {
			return s, nil
		}
		if bad, ok := err.(*FileError); ok && o.IndexBase == OneBased && bad.Row == 0 && bad.Found == `"0"` {
			bad.Flag = "--index-base 0"
		}
		if err != nil {
			return s, err
		}
		for k, i := range c.out.I {
			j := c.out.J[k]
			s.least = min(s.least, i, j)
			s.rows, s.cols = max(s.rows, int(i)+1), max(s.cols, int(j)+1)
		}
		s.count += c.stored
		at.lines += c.lines
		pipe.release(c)
	}
}
