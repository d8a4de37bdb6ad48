package halo

import (
	"context"
	"fmt"
	"sync"
)

// NewLocal returns the exchanges of so many blocks in one process, for block p
// at p. They pass slices through channels: the only copy is the one of Collect.
// They hold no goroutine and nothing that must be closed. Memory is taken for
// pairs of blocks that talk.
func NewLocal(blocks int) []Exchange {
	links := &links{made: map[[2]int]*link{}}
	all := make([]Exchange, blocks)
	for p := range all {
		all[p] = &local{block: p, links: links, out: make([]*link, blocks), in: make([]*link, blocks)}
	}
	return all
}

// link leads from one block to another and holds at most one message.
type link struct {
	full chan []float64 // room for one
	free chan struct{}  // holds a token while nothing is on the way or being copied
}

// links makes the link of a pair when either end first asks for it.
type links struct {
	mu   sync.Mutex
	made map[[2]int]*link
}

func (l *links) between(from, to int) *link {
	l.mu.Lock()
	defer l.mu.Unlock()
	pair := [2]int{from, to}
	k := l.made[pair]
	if k == nil {
		k = &link{full: make(chan []float64, 1), free: make(chan struct{}, 1)}
		k.free <- struct{}{}
		l.made[pair] = k
	}
	return k
}

// local is the Exchange of one block within a process.
type local struct {
	block   int
	links   *links
	out, in []*link // by peer, nil until used
}

// Post waits for the token, which comes back when the peer has copied the
// message before; so that one's buffer is free when Post returns.
func (l *local) Post(ctx context.Context, peer int, values []float64) error {
	if l.out[peer] == nil {
		l.out[peer] = l.links.between(l.block, peer)
	}
	k := l.out[peer]
	if err := ctx.Err(); err != nil {
		return l.failed("post to", peer, err)
	}
	select {
	case <-k.free:
	case <-ctx.Done():
		return l.failed("post to", peer, ctx.Err())
	}
	k.full <- values // has room: the token is ours
	return nil
}

func (l *local) Collect(ctx context.Context, peer int, into []float64) error {
	if l.in[peer] == nil {
		l.in[peer] = l.links.between(peer, l.block)
	}
	k := l.in[peer]
	if err := ctx.Err(); err != nil {
		return l.failed("collect from", peer, err)
	}
	select {
	case values := <-k.full:
		defer func() { k.free <- struct{}{} }()
		if len(values) != len(into) {
			return l.failed("collect from", peer, fmt.Errorf("%d numbers came; want %d", len(values), len(into)))
		}
		copy(into, values)
		return nil
	case <-ctx.Done():
		return l.failed("collect from", peer, ctx.Err())
	}
}

func (l *local) failed(op string, peer int, err error) error {
	return fmt.Errorf("halo of row block %d: %s row block %d: %w", l.block, op, peer, err)
}
