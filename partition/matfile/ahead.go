package matfile

import (
	"io"
	"sync"
)

// ahead reads (and inflates) in a goroutine of its own, a few blocks before
// its reader. Close it.
type ahead struct {
	full, free chan aheadBlock
	quit       chan struct{}
	running    sync.WaitGroup
	rest       []byte // of the current block, not yet handed out
	current    aheadBlock
	ended      error
}

type aheadBlock struct {
	bytes []byte
	err   error // behind the bytes
}

const (
	aheadBlocks = 3
	aheadSize   = 128 << 10
)

func newAhead(in io.Reader) *ahead {
	a := &ahead{full: make(chan aheadBlock, aheadBlocks), free: make(chan aheadBlock, aheadBlocks), quit: make(chan struct{})}
	for range aheadBlocks {
		a.free <- aheadBlock{}
	}
	a.running.Add(1)
	go a.fill(in)
	return a
}

func (a *ahead) fill(in io.Reader) {
	defer a.running.Done()
	for {
		var b aheadBlock
		select {
		case <-a.quit:
			return
		case b = <-a.free:
		}
		if b.bytes == nil {
			b.bytes = make([]byte, aheadSize)
		}
		b.bytes = b.bytes[:cap(b.bytes)]
		n := 0
		for n < len(b.bytes) && b.err == nil {
			var k int
			k, b.err = in.Read(b.bytes[n:])
			n += k
		}
		b.bytes = b.bytes[:n]
		a.full <- b
		if b.err != nil {
			return
		}
	}
}

// Read hands out what was read ahead.
func (a *ahead) Read(p []byte) (int, error) {
	for len(a.rest) == 0 {
		if a.ended != nil {
			return 0, a.ended
		}
		if a.current.bytes != nil {
			a.free <- aheadBlock{bytes: a.current.bytes}
		}
		a.current = <-a.full
		a.rest, a.ended = a.current.bytes, a.current.err
	}
	n := copy(p, a.rest)
	a.rest = a.rest[n:]
	return n, nil
}

// close ends the goroutine and waits for it.
func (a *ahead) close() {
	close(a.quit)
	a.running.Wait()
}
