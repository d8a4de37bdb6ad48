package remote

import (
	"context"
	"fmt"
	"sync"

	"rowstead/proto/link"
)

// recent keeps the sketches that workers send behind their steps until they are
// collected, which happens once.
type recent struct {
	mu        sync.Mutex
	width     int         // guarded by mu; floats of a vector's sketches
	vectors   int         // guarded by mu; made in this cycle
	held      [][]float64 // guarded by mu; by vector, nil: not here
	collected []bool      // guarded by mu; by vector
	came      chan struct{}
}

// reset begins a cycle whose sketches have that width; 0: none come.
func (r *recent) reset(width int) {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.width, r.vectors, r.held, r.collected = width, 0, r.held[:0], r.collected[:0]
}

// made notes that a vector more has been made.
func (r *recent) made() {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.vectors++
}

// put keeps the sketches of a vector. They may come before the answer to the step
// is looked at, but not earlier, and in order.
func (r *recent) put(vector int, sketches []float64) error {
	r.mu.Lock()
	defer r.mu.Unlock()
	if len(sketches) != r.width || vector != len(r.held) || vector > r.vectors {
		return fmt.Errorf("sketches of vector %d with %d numbers, expected vector %d with %d", vector, len(sketches), len(r.held), r.width)
	}
	r.held, r.collected = append(r.held, sketches), append(r.collected, false)
	select {
	case r.came <- struct{}{}:
	default:
	}
	return nil
}

// knows says that the sketches of [from, to) are here or on their way.
func (r *recent) knows(from, to int) bool {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.width == 0 || from < 0 || from >= to || to > r.vectors {
		return false
	}
	for j := from; j < min(to, len(r.collected)); j++ {
		if r.collected[j] {
			return false
		}
	}
	return true
}

// take waits for the sketches of [from, to), which knows has vouched for, hands
// each to see and lets go of it.
func (r *recent) take(ctx context.Context, p *link.Pipe, from, to int, see func([]float64)) error {
	for {
		r.mu.Lock()
		if len(r.held) >= to {
			for j := from; j < to; j++ {
				see(r.held[j])
				r.held[j], r.collected[j] = nil, true
			}
			r.mu.Unlock()
			return nil
		}
		r.mu.Unlock()
		select {
		case <-r.came:
		case <-ctx.Done():
			return ctx.Err()
		case <-p.Ended():
			return p.Err()
		}
	}
}
