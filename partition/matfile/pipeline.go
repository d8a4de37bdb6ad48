package matfile

import (
	"bytes"
	"io"
	"sync"

	"rowstead/partition/csr"
)

// chunk is a piece of text that ends at a line end, and what was parsed from it.
type chunk struct {
	text   []byte       // owned by the chunk, ends with '\n'
	lines  int          // line ends in text
	stored int64        // entries or numbers in text, as the file counts them
	out    csr.Triplets // entries, expanded; or
	values []float64    // bare numbers
	err    error        // a *FileError carries the line within the chunk
	parsed chan struct{}
}

// pipeline reads (and inflates) text in one goroutine, parses chunks in several,
// and hands them out in file order. Bounded: a fixed set of chunks goes round.
type pipeline struct {
	in    *stream
	size  int
	parse func(*chunk)

	free, work, order chan *chunk
	quit              chan struct{}
	running           sync.WaitGroup
}

// newPipeline prepares one; parse fills in stored, out or values, and err of a
// chunk, is called from several goroutines and keeps no state between chunks.
func newPipeline(in *stream, o Options, parse func(*chunk)) *pipeline {
	threads := o.threads()
	chunks := 2*threads + 2
	p := &pipeline{in: in, size: in.bufferSize(o.chunk()), parse: parse,
		free: make(chan *chunk, chunks), work: make(chan *chunk, chunks), order: make(chan *chunk, chunks+1), quit: make(chan struct{})}
	for range chunks {
		p.free <- &chunk{parsed: make(chan struct{}, 1)}
	}
	p.running.Add(threads + 1)
	go p.cut()
	for range threads {
		go p.parseAll()
	}
	return p
}

// next returns the next chunk in file order, io.EOF behind the last. Give it
// back with release.
func (p *pipeline) next() (*chunk, error) {
	c, open := <-p.order
	if !open {
		return nil, io.EOF
	}
	<-c.parsed
	return c, nil
}

// release lets the pipeline use the chunk again.
func (p *pipeline) release(c *chunk) { p.free <- c }

// stop ends the goroutines and waits for them.
func (p *pipeline) stop() {
	close(p.quit)
	p.running.Wait()
}

func (p *pipeline) parseAll() {
	defer p.running.Done()
	for c := range p.work {
		c.stored, c.err = 0, nil
		c.lines = bytes.Count(c.text, []byte{'\n'})
		p.parse(c)
		c.parsed <- struct{}{}
	}
}

// cut fills chunks up to the last line end and carries the rest over.
func (p *pipeline) cut() {
	defer p.running.Done()
	defer close(p.work)
	defer close(p.order)
	var carry []byte
	for {
		var c *chunk
		select {
		case <-p.quit:
			return
		case c = <-p.free:
		}
		c.text = append(c.text[:0], carry...)
		rest, err := p.fill(c)
		carry = append(carry[:0], rest...)
		if len(c.text) > 0 {
			p.order <- c
			p.work <- c
		}
		if err == nil {
			continue
		}
		if err != io.EOF {
			p.order <- &chunk{err: err, parsed: closedChannel()}
		}
		return
	}
}

// fill reads until the chunk is full and holds a line end; rest is what stands
// behind the last line end and aliases the chunk's memory. At the end of the
// file a missing line end is added.
func (p *pipeline) fill(c *chunk) (rest []byte, err error) {
	full := max(p.size, 2*len(c.text))
	for {
		if cap(c.text) < full+1 {
			c.text = append(make([]byte, 0, full+1), c.text...)
		}
		n, err := p.readFull(c.text[len(c.text):full])
		c.text = c.text[:len(c.text)+n]
		if err == io.EOF {
			if n := len(c.text); n > 0 && c.text[n-1] != '\n' {
				c.text = append(c.text, '\n')
			}
			return nil, err
		}
		if end := bytes.LastIndexByte(c.text, '\n') + 1; end > 0 {
			rest, c.text = c.text[end:], c.text[:end]
			return rest, err
		}
		if err != nil {
			c.text = c.text[:0]
			return nil, err
		}
		if len(c.text) >= p.size+longestLine {
			c.text = c.text[:0]
			return nil, tooLong(p.in.path, 1)
		}
		full = min(2*full, p.size+longestLine)
	}
}

// readFull fills b; io.EOF where the file ends before it is full.
func (p *pipeline) readFull(b []byte) (int, error) {
	n := 0
	for n < len(b) {
		k, err := p.in.in.Read(b[n:])
		n += k
		if err == io.EOF {
			return n, io.EOF
		}
		if err != nil {
			return n, p.in.readError(err, 1)
		}
	}
	return n, nil
}

func closedChannel() chan struct{} {
	c := make(chan struct{})
	close(c)
	return c
}
