package remote

import (
	"context"

	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/proto"
)

// chunk is how many entries, or numbers of a vector, go out at once; a longer row
// goes alone.
const chunk = 1 << 16

// place sends the worker its rows, its parts of the scaling, of b and of x, and
// returns the columns of its halo.
func (w *Worker) place(ctx context.Context, p Problem) ([]int32, error) {
	place := &proto.Place{
		Block: int32(w.block), Entries: int64(p.Matrix.Start[w.hi] - p.Matrix.Start[w.lo]),
		Threads: int32(share(p.Threads, p.Cuts.Blocks(), w.block)),
	}
	for _, c := range append(p.Cuts.Starts(), p.Cuts.Rows()) {
		place.Cuts = append(place.Cuts, int64(c))
	}
	if err := w.ask(ctx, &proto.Order{What: &proto.Order_Place{Place: place}}, nil); err != nil {
		return nil, err
	}
	if err := w.sendRows(ctx, p.Matrix); err != nil {
		return nil, err
	}
	if p.RowExponent != nil {
		if err := w.sendExponents(ctx, p.RowExponent[w.lo:w.hi]); err != nil {
			return nil, err
		}
	}
	if err := w.sendVector(ctx, proto.Vector_RIGHT, p.Right[w.lo:w.hi]); err != nil {
		return nil, err
	}
	if p.Guess != nil {
		if err := w.sendVector(ctx, proto.Vector_GUESS, p.Guess[w.lo:w.hi]); err != nil {
			return nil, err
		}
	}
	a, err := w.call(ctx, &proto.Order{What: &proto.Order_Settle{Settle: &proto.Settle{}}}, nil)
	if err == nil && a.GetNeeds() == nil {
		err = errAnswer
	}
	return a.ints, err
}

// share is the part of so many threads that block k of blocks gets, at least 1.
func share(threads, blocks, k int) int {
	n := threads / blocks
	if k < threads%blocks {
		n++
	}
	return max(n, 1)
}

// sendRows sends the worker's rows in chunks.
func (w *Worker) sendRows(ctx context.Context, m *csr.Matrix) error {
	var ints []int32
	for row := w.lo; row < w.hi; {
		next := row + 1
		for next < w.hi && m.Start[next+1]-m.Start[row] <= chunk && next-row < chunk {
			next++
		}
		from, to := m.Start[row], m.Start[next]
		ints = ints[:0]
		for i := row; i < next; i++ {
			ints = append(ints, int32(m.Start[i+1]-m.Start[i]))
		}
		ints = append(ints, m.Col[from:to]...)
		o := &proto.Order{What: &proto.Order_Rows{Rows: &proto.Rows{Rows: int32(next - row)}}}
		if err := w.ask(ctx, o, ints, m.Val[from:to]); err != nil {
			return err
		}
		row = next
	}
	return nil
}

// sendVector sends a vector of the worker's length in chunks.
func (w *Worker) sendVector(ctx context.Context, kind proto.Vector_Kind, v []float64) error {
	for len(v) > 0 {
		n := min(chunk, len(v))
		o := &proto.Order{What: &proto.Order_Vector{Vector: &proto.Vector{Kind: kind}}}
		if err := w.ask(ctx, o, nil, v[:n]); err != nil {
			return err
		}
		v = v[n:]
	}
	return nil
}

// sendExponents sends the scaling of the worker's rows in chunks.
func (w *Worker) sendExponents(ctx context.Context, e []int16) error {
	for len(e) > 0 {
		ints := make([]int32, min(chunk, len(e)))
		for k := range ints {
			ints[k] = int32(e[k])
		}
		o := &proto.Order{What: &proto.Order_Vector{Vector: &proto.Vector{Kind: proto.Vector_EXPONENT}}}
		if err := w.ask(ctx, o, ints); err != nil {
			return err
		}
		e = e[len(ints):]
	}
	return nil
}

// connect tells the workers what they owe each other and makes ways between
// neighbours: the later block calls the earlier one; where that fails the other
// way round; where that fails too, halos go through the coordinator.
func (s *Space) connect(ctx context.Context, plan *partition.HaloPlan) error {
	pairs := neighbours(plan)
	if err := s.introduce(ctx, plan, pairs); err != nil {
		return err
	}
	left, err := s.dial(ctx, pairs, func(p Pair) (caller, called int) { return p.Second, p.First })
	if err != nil {
		return err
	}
	if s.relayed, err = s.dial(ctx, left, func(p Pair) (caller, called int) { return p.First, p.Second }); err != nil {
		return err
	}
	return s.each(ctx, "relay", func(ctx context.Context, k int, w *Worker) error {
		relay := &proto.Connect{}
		for _, p := range s.relayed {
			if p.First == k || p.Second == k {
				relay.Relay = append(relay.Relay, int32(p.First+p.Second-k))
			}
		}
		if relay.Relay == nil {
			return nil
		}
		_, err := w.connect(ctx, relay)
		return err
	})
}

// introduce tells every worker what it owes to whom, and who may call it.
func (s *Space) introduce(ctx context.Context, plan *partition.HaloPlan, pairs []Pair) error {
	return s.each(ctx, "tell of neighbours", func(ctx context.Context, k int, w *Worker) error {
		for _, send := range plan.Blocks[k].Send {
			o := &proto.Order{What: &proto.Order_Owes{Owes: &proto.Owes{Peer: int32(send.Peer)}}}
			if err := w.ask(ctx, o, send.LocalRows); err != nil {
				return err
			}
		}
		expect := &proto.Connect{}
		for _, p := range pairs {
			if p.First == k || p.Second == k {
				expect.Expect = append(expect.Expect, s.peer(p.First+p.Second-k))
			}
		}
		_, err := w.connect(ctx, expect)
		return err
	})
}

// neighbours are the pairs of blocks that exchange anything, First < Second.
func neighbours(plan *partition.HaloPlan) []Pair {
	var pairs []Pair
	for k := range plan.Blocks {
		talks := map[int]bool{}
		for _, r := range plan.Blocks[k].Receive {
			talks[r.Peer] = true
		}
		for _, s := range plan.Blocks[k].Send {
			talks[s.Peer] = true
		}
		for peer := k + 1; peer < len(plan.Blocks); peer++ {
			if talks[peer] {
				pairs = append(pairs, Pair{k, peer})
			}
		}
	}
	return pairs
}

func (s *Space) peer(k int) *proto.Connect_Peer {
	return &proto.Connect_Peer{Block: int32(k), Name: s.workers[k].name, Address: s.workers[k].neighbour}
}

// dial lets one of each pair call the other and returns the pairs that failed.
func (s *Space) dial(ctx context.Context, pairs []Pair, who func(Pair) (caller, called int)) (left []Pair, err error) {
	unreached := make([]map[int]bool, len(s.workers))
	err = s.each(ctx, "call neighbours", func(ctx context.Context, k int, w *Worker) error {
		calls := &proto.Connect{}
		for _, p := range pairs {
			if caller, called := who(p); caller == k {
				calls.Dial = append(calls.Dial, s.peer(called))
			}
		}
		if calls.Dial == nil {
			return nil
		}
		var err error
		unreached[k], err = w.connect(ctx, calls)
		return err
	})
	for _, p := range pairs {
		if caller, called := who(p); unreached[caller][called] {
			left = append(left, p)
		}
	}
	return left, err
}

// connect sends a Connect and returns the blocks that could not be reached.
func (w *Worker) connect(ctx context.Context, o *proto.Connect) (map[int]bool, error) {
	a, err := w.call(ctx, &proto.Order{What: &proto.Order_Connect{Connect: o}}, nil)
	if err != nil {
		return nil, err
	}
	if a.GetConnected() == nil {
		return nil, errAnswer
	}
	unreached := map[int]bool{}
	for _, k := range a.GetConnected().Unreached {
		unreached[int(k)] = true
	}
	return unreached, nil
}
