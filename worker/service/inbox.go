package service

import (
	"context"
	"sync"

	"rowstead/proto/frame"
)

// inbox holds frames that came and have not been collected, one goroutine
// pushing and one pulling.
type inbox struct {
	most int // a frame is taken in while fewer numbers are held

	mu      sync.Mutex
	frames  []*frame.Received // guarded by mu
	numbers int               // guarded by mu; in frames
	err     error             // guarded by mu; nothing will come any more

	came chan struct{} // holds one when something came
	room chan struct{} // holds one when something went
}

func newInbox(most int) *inbox {
	return &inbox{most: most, came: make(chan struct{}, 1), room: make(chan struct{}, 1)}
}

func signal(c chan struct{}) {
	select {
	case c <- struct{}{}:
	default:
	}
}

// push takes a frame in, waiting for room until done is closed; then it returns
// false.
func (b *inbox) push(done <-chan struct{}, r *frame.Received) bool {
	for {
		b.mu.Lock()
		if b.numbers < b.most {
			b.frames, b.numbers = append(b.frames, r), b.numbers+r.Floats
			b.mu.Unlock()
			signal(b.came)
			return true
		}
		b.mu.Unlock()
		select {
		case <-b.room:
		case <-done:
			return false
		}
	}
}

// fail says that nothing will come any more; what is there can still be pulled.
func (b *inbox) fail(err error) {
	b.mu.Lock()
	b.err = err
	b.mu.Unlock()
	signal(b.came)
}

// pull waits for the next frame.
func (b *inbox) pull(ctx context.Context) (*frame.Received, error) {
	for {
		b.mu.Lock()
		if len(b.frames) > 0 {
			r := b.frames[0]
			b.frames, b.numbers = append(b.frames[:0], b.frames[1:]...), b.numbers-r.Floats
			b.mu.Unlock()
			signal(b.room)
			return r, nil
		}
		err := b.err
		b.mu.Unlock()
		if err != nil {
			return nil, err
		}
		select {
		case <-b.came:
		case <-ctx.Done():
			return nil, ctx.Err()
		}
	}
}
