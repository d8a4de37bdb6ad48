package service

import (
	"context"
	"fmt"

	"rowstead/proto"
)

// rounds is how many rounds may be on their way to a neighbour through the
// coordinator before the first of them has been collected.
const rounds = 2

// relayed is a way through the coordinator.
type relayed struct {
	s     *session
	peer  int
	most  int            // numbers of a round
	came  chan []float64 // rounds that came and have not been collected
	grant chan struct{}  // one for each round that may be posted
}

func newRelayed(s *session, peer, most int) *relayed {
	r := &relayed{s: s, peer: peer, most: most, came: make(chan []float64, rounds), grant: make(chan struct{}, rounds)}
	for range rounds {
		r.grant <- struct{}{}
	}
	return r
}

func (r *relayed) post(ctx context.Context, values []float64) (bytes int, relayed bool, err error) {
	select {
	case <-r.grant:
	case <-ctx.Done():
		return 0, true, ctx.Err()
	}
	what := &proto.Reply_Relayed{Relayed: &proto.Relayed{Peer: int32(r.peer)}}
	bytes, err = r.s.send(&proto.Reply{What: what}, nil, values)
	return bytes, true, err
}

func (r *relayed) collect(ctx context.Context, into []float64) error {
	select {
	case values := <-r.came:
		if len(values) != len(into) {
			return fmt.Errorf("%d entries came, expected %d", len(values), len(into))
		}
		copy(into, values)
	case <-ctx.Done():
		return ctx.Err()
	}
	what := &proto.Reply_Taken{Taken: &proto.Taken{Peer: int32(r.peer)}}
	_, err := r.s.send(&proto.Reply{What: what}, nil)
	return err
}

// relayed takes in a round from peer that came through the coordinator.
func (x *exchange) relayed(peer int, values []float64) error {
	r, err := x.relayTo(peer)
	if err != nil {
		return err
	}
	if len(values) > r.most {
		return fmt.Errorf("a relayed halo of %d entries, expected at most %d", len(values), r.most)
	}
	select {
	case r.came <- values:
		return nil
	default:
		return fmt.Errorf("more relayed halos from block %d than were granted", peer+1)
	}
}

// taken notes that peer has collected a round of ours.
func (x *exchange) taken(peer int) error {
	r, err := x.relayTo(peer)
	if err != nil {
		return err
	}
	select {
	case r.grant <- struct{}{}:
		return nil
	default:
		return fmt.Errorf("block %d has taken a halo that was not sent", peer+1)
	}
}

// relayTo is the way through the coordinator to peer.
func (x *exchange) relayTo(peer int) (*relayed, error) {
	r, found := x.to(peer).(*relayed)
	if !found {
		return nil, fmt.Errorf("nothing is relayed to or from block %d", peer+1)
	}
	return r, nil
}
