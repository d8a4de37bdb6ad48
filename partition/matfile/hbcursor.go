package matfile

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
)

// cursor reads the fields of one part of a Boeing file, which it opens for
// itself: pointers, indices and values stand one behind the other but are used
// together.
type cursor struct {
	in      *stream
	ahead   *ahead
	what    string // of the part, in errors
	format  []fortranField
	left    int64 // fields not yet read
	lines   int   // of the file, read so far
	line    []byte
	words   [][]byte // of line where they are as many as its fields, else empty
	at      int      // of the next field on line
	scratch []byte
}

// openCursor opens path and skips lines.
func openCursor(path, what string, skip, count int64, format []fortranField) (*cursor, error) {
	in, err := openStream(path)
	if err != nil {
		return nil, err
	}
	a := newAhead(in.in)
	in.in = bufio.NewReaderSize(a, in.bufferSize(64<<10))
	c := &cursor{in: in, ahead: a, what: what}
	for range skip {
		if err := c.nextLine(); err != nil {
			c.close()
			return nil, err
		}
	}
	c.part(count, format)
	return c, nil
}

// part begins a part of count fields on the next line.
func (c *cursor) part(count int64, format []fortranField) {
	c.left, c.format, c.at = count, format, len(format)
}

func (c *cursor) nextLine() error {
	line, err := c.in.readLine(c.lines + 1)
	if err == io.EOF {
		return &FileError{Path: c.in.path, Line: c.lines, Expected: "more lines, " + c.what + " among them", Found: "the end of the file"}
	}
	c.lines++
	c.line = line
	return err
}

// refuse says what should stand in field f of the current line.
func (c *cursor) refuse(f fortranField, expected string, found []byte) *FileError {
	return &FileError{Path: c.in.path, Line: c.lines, Expected: fmt.Sprintf("%s in columns %d to %d (%s)", expected, f.from+1, f.to, c.what), Found: quote(found)}
}

// field returns the next field and its text.
func (c *cursor) field() (fortranField, []byte, error) {
	if c.left == 0 {
		return fortranField{}, nil, &FileError{Path: c.in.path, Line: c.lines, Expected: "more " + c.what, Found: "their end"}
	}
	if c.at == len(c.format) {
		if err := c.nextLine(); err != nil {
			return fortranField{}, nil, err
		}
		c.at = 0
		c.split(int(min(c.left, int64(len(c.format)))))
	}
	f, text := c.format[c.at], []byte(nil)
	if len(c.words) > 0 {
		text = c.words[c.at]
	} else {
		text = f.cut(c.line)
	}
	c.at++
	c.left--
	return f, text, nil
}

// split cuts the line at blanks where that gives the expected number of words.
// In a file that keeps to its format these are the fields; some programs write
// other widths than their format says, and then only the words are right.
func (c *cursor) split(expected int) {
	c.words = c.words[:0]
	for rest := bytes.TrimSpace(c.line); len(rest) > 0; {
		end := bytes.IndexAny(rest, " \t")
		if end < 0 {
			end = len(rest)
		}
		n := len(c.words)
		if n == expected || end > c.format[n].to-c.format[n].from {
			c.words = c.words[:0]
			return
		}
		c.words = append(c.words, rest[:end])
		rest = bytes.TrimLeft(rest[end:], " \t")
	}
	if len(c.words) != expected {
		c.words = c.words[:0]
	}
}

// whole reads the next field as a whole number.
func (c *cursor) whole() (int64, error) {
	f, text, err := c.field()
	if err != nil {
		return 0, err
	}
	n, ok := wholeNumber(text)
	if !ok {
		return 0, c.refuse(f, "a whole number", text)
	}
	return n, nil
}

// number reads the next field as a finite number.
func (c *cursor) number() (float64, error) {
	f, text, err := c.field()
	if err != nil {
		return 0, err
	}
	v, ok := f.real(text, &c.scratch)
	if !ok {
		return 0, c.refuse(f, "a finite number", text)
	}
	return v, nil
}

// endOfLine refuses text behind the last field of a part.
func (c *cursor) endOfLine() error {
	if c.left > 0 || c.at == 0 || c.line == nil || len(c.words) > 0 {
		return nil
	}
	last := c.format[c.at-1]
	if rest := fixed(c.line, last.to, len(c.line)); len(rest) > 0 && c.at < len(c.format) {
		return &FileError{Path: c.in.path, Line: c.lines, Expected: "the end of the " + c.what, Found: quote(rest)}
	}
	return nil
}

// remaining counts the lines with text up to the end of the file.
func (c *cursor) remaining() (int64, error) {
	n := int64(0)
	for {
		line, err := c.in.readLine(c.lines + 1)
		if err == io.EOF {
			return n, nil
		}
		if err != nil {
			return n, err
		}
		c.lines++
		if len(bytes.TrimSpace(line)) > 0 {
			n++
		}
	}
}

func (c *cursor) close() error {
	c.ahead.close()
	return c.in.close()
}
