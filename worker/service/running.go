package service

import (
	"context"
	"sync"

	"rowstead/proto/link"
)

// running is the verb in work, which the coordinator may cancel.
type running struct {
	mu     sync.Mutex
	number uint64 // guarded by mu; of the verb in work, 0: none
	end    func() // guarded by mu
	early  uint64 // guarded by mu; cancelled before it began
}

// begin returns the context of a verb, which ends when the verb is cancelled or
// the pipe ends; done must be called when it is over.
func (r *running) begin(ctx context.Context, p *link.Pipe, number uint64) (inner context.Context, done func()) {
	inner, end := context.WithCancel(ctx)
	stop := make(chan struct{})
	var watch sync.WaitGroup
	watch.Go(func() {
		select {
		case <-p.Ended():
			end()
		case <-stop:
		}
	})
	r.mu.Lock()
	r.number, r.end = number, end
	if number != 0 && r.early == number {
		end()
	}
	r.mu.Unlock()
	return inner, func() {
		r.mu.Lock()
		r.number, r.end = 0, nil
		r.mu.Unlock()
		close(stop)
		watch.Wait()
		end()
	}
}

// cancel ends the verb of that number, now or as soon as it begins.
func (r *running) cancel(number uint64) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.end != nil && r.number == number {
		r.end()
		return
	}
	r.early = number
}
