package matfile

import (
	"errors"
	"fmt"
	"io"

	"rowstead/partition/csr"
)

// Reader streams the entries of one matrix file. It is for one goroutine.
type Reader struct {
	head   Header
	body   body
	ended  error
	closed bool
}

// body is what stands behind a header: entries in chunks.
type body interface {
	// next replaces dst by the next entries, io.EOF behind the last.
	next(dst *csr.Triplets) error
	close() error
}

// Open tells the format of the file at path and reads its header. Close the
// Reader. Plain triplets have no header: they are read once here, for their
// size.
func Open(path string, o Options) (*Reader, error) {
	return open(path, o, asMatrix)
}

// use says what a file is opened for.
type use int

const (
	asMatrix use = iota
	asVectors
)

func open(path string, o Options, purpose use) (*Reader, error) {
	in, err := openStream(path)
	if err != nil {
		return nil, err
	}
	r, err := openFormat(in, o, purpose)
	if err != nil {
		in.close()
		return nil, err
	}
	return r, nil
}

// Header returns what the file says of itself.
func (r *Reader) Header() Header { return r.head }

// Next replaces the contents of dst by the next chunk of entries, in file
// order: symmetric halves expanded, complex entries in real form. It takes over
// the memory of dst and gives its own, so a caller must not keep slices of an
// earlier chunk. io.EOF comes at the end, after the counts were checked; after
// an error every call returns it again.
func (r *Reader) Next(dst *csr.Triplets) error {
	if r.closed {
		return errors.New("matfile: Next after Close")
	}
	if r.ended != nil {
		return r.ended
	}
	for {
		if err := r.body.next(dst); err != nil {
			dst.I, dst.J, dst.V = dst.I[:0], dst.J[:0], dst.V[:0]
			r.ended = err
			return err
		}
		if len(dst.V) > 0 {
			return nil
		}
	}
}

// Close ends the reading goroutines, waits for them and closes the file. It may
// be called at any time and more than once.
func (r *Reader) Close() error {
	if r.closed {
		return nil
	}
	r.closed = true
	return r.body.close()
}

// entryBody delivers the entries of coordinate text.
type entryBody struct {
	lineTracker
	in     *stream
	pipe   *pipeline
	layout *coordinates
	opts   Options
	stored int64 // promised by the header
}

func (b *entryBody) next(dst *csr.Triplets) error {
	if b.pipe == nil {
		b.pipe = newPipeline(b.in, b.opts, b.layout.parse)
	}
	c, err := b.take(b.pipe)
	if err == io.EOF && b.count < b.stored {
		return &FileError{Path: b.in.path, Line: b.lines, Expected: countOf(b.stored, "entry", "entries"), Found: fmt.Sprintf("the end of the file after %d", b.count)}
	}
	if err != nil {
		return err
	}
	if b.count+c.stored > b.stored {
		return b.tooMany(c)
	}
	b.count, b.lines = b.count+c.stored, b.lines+c.lines
	*dst, c.out = c.out, *dst
	b.pipe.release(c)
	return nil
}

// tooMany finds the line of the first entry that the header does not promise.
func (b *entryBody) tooMany(c *chunk) error {
	line := b.lines + lineOfEntry(c.text, b.stored-b.count, b.layout)
	return &FileError{Path: b.in.path, Line: line, Expected: "the end of the file after " + countOf(b.stored, "entry", "entries"), Found: "another entry"}
}

// lineOfEntry returns the line within text of its k-th entry.
func lineOfEntry(text []byte, k int64, g *coordinates) int {
	for p, line := 0, 1; p < len(text); line++ {
		end := p
		for text[end] != '\n' {
			end++
		}
		var e entry
		if skip, err := g.slowLine(text[p:end], &e); !skip && err == nil {
			if k == 0 {
				return line
			}
			k--
		}
		p = end + 1
	}
	return 0
}

func (b *entryBody) close() error { return closePipe(b.pipe, b.in) }

func closePipe(p *pipeline, in *stream) error {
	if p != nil {
		p.stop()
	}
	return in.close()
}

// lineTracker turns lines within a chunk into lines of the file.
type lineTracker struct {
	lines int   // of the file, before the next chunk
	count int64 // entries or numbers before the next chunk
}

// take returns the next chunk, or its error with the line in the file.
func (t *lineTracker) take(p *pipeline) (*chunk, error) {
	c, err := p.next()
	if err == nil {
		err = c.err
	}
	var bad *FileError
	if errors.As(err, &bad) && bad.Line > 0 {
		located := *bad
		located.Line += t.lines
		return nil, &located
	}
	return c, err
}
