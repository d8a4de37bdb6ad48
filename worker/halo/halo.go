package halo

import (
	"context"

	"rowstead/partition"
)

// Halo is one block's side of a halo plan. All its memory is taken by New.
//
// Gather and Scatter are each a round: every block of the plan must make the
// same calls in the same order, at the same time or, on one goroutine, first
// all the Post halves and then all the Collect halves.
type Halo struct {
	plan *partition.BlockHalo
	x    Exchange
	send []buffers // of plan.Send, for Gather; what comes back, for Scatter
	back []buffers // of plan.Receive, for Scatter
	got  []float64 // room for the longest list of plan.Send
}

// buffers are filled in turn, so that one may still be on its way.
type buffers struct {
	pair [2][]float64
	turn int
}

func newBuffers(n int) buffers {
	room := make([]float64, 2*n)
	return buffers{pair: [2][]float64{room[:n:n], room[n:]}}
}

// next returns the buffer whose Post came before the last Post.
func (b *buffers) next() []float64 {
	b.turn = 1 - b.turn
	return b.pair[b.turn]
}

// New returns the block's side of plan over x, the exchange of the same block.
// plan must not change afterwards.
func New(plan *partition.BlockHalo, x Exchange) *Halo {
	h := &Halo{plan: plan, x: x, send: make([]buffers, len(plan.Send)), back: make([]buffers, len(plan.Receive))}
	longest := 0
	for k, s := range plan.Send {
		h.send[k] = newBuffers(len(s.LocalRows))
		longest = max(longest, len(s.LocalRows))
	}
	for k, r := range plan.Receive {
		h.back[k] = newBuffers(r.Hi - r.Lo)
	}
	h.got = make([]float64, longest)
	return h
}

// Bytes is the memory that New took for buffers.
func (h *Halo) Bytes() int64 {
	n := len(h.got)
	for _, s := range h.plan.Send {
		n += 2 * len(s.LocalRows)
	}
	return 8 * int64(n+2*len(h.plan.Columns))
}

// Gather brings the halo of a vector of which this block has the own rows.
//
//	own   length plan.Rows; may change as soon as Gather returns
//	halo  length len(plan.Columns); overwritten, in the order of the plan
//
// It is PostOwn and then CollectHalo.
func (h *Halo) Gather(ctx context.Context, own, halo []float64) error {
	if err := h.PostOwn(ctx, own); err != nil {
		return err
	}
	return h.CollectHalo(ctx, halo)
}

// PostOwn sends every neighbour the own entries that it needs. own may change
// as soon as PostOwn returns.
func (h *Halo) PostOwn(ctx context.Context, own []float64) error {
	if len(own) != h.plan.Rows {
		panic("halo: own rows of another length than the plan's")
	}
	for k := range h.plan.Send {
		s := &h.plan.Send[k]
		values := h.send[k].next()
		for j, row := range s.LocalRows {
			values[j] = own[row]
		}
		if err := h.x.Post(ctx, s.Peer, values); err != nil {
			return err
		}
	}
	return nil
}

// CollectHalo waits for the halo entries of the round that PostOwn began.
func (h *Halo) CollectHalo(ctx context.Context, halo []float64) error {
	if len(halo) != len(h.plan.Columns) {
		panic("halo: a halo of another length than the plan's")
	}
	for _, r := range h.plan.Receive {
		if err := h.x.Collect(ctx, r.Peer, halo[r.Lo:r.Hi]); err != nil {
			return err
		}
	}
	return nil
}

// Scatter is the transpose of Gather: it takes this block's contributions to
// its halo entries back to their owners, who add them.
//
//	halo  length len(plan.Columns); may change as soon as Scatter returns
//	own   length plan.Rows, holding this block's own contributions; those of
//	      the peers are added in ascending order of peers
//
// So the bits depend on the cuts, but not on the order of arrival. It is
// PostHalo and then CollectOwn.
func (h *Halo) Scatter(ctx context.Context, halo, own []float64) error {
	if err := h.PostHalo(ctx, halo); err != nil {
		return err
	}
	return h.CollectOwn(ctx, own)
}

// PostHalo sends every owner the contributions to its entries. halo may change
// as soon as PostHalo returns.
func (h *Halo) PostHalo(ctx context.Context, halo []float64) error {
	if len(halo) != len(h.plan.Columns) {
		panic("halo: a halo of another length than the plan's")
	}
	for k, r := range h.plan.Receive {
		values := h.back[k].next()
		copy(values, halo[r.Lo:r.Hi])
		if err := h.x.Post(ctx, r.Peer, values); err != nil {
			return err
		}
	}
	return nil
}

// CollectOwn waits for the contributions of the round that PostHalo began and
// adds them to own.
func (h *Halo) CollectOwn(ctx context.Context, own []float64) error {
	if len(own) != h.plan.Rows {
		panic("halo: own rows of another length than the plan's")
	}
	for k := range h.plan.Send {
		s := &h.plan.Send[k]
		got := h.got[:len(s.LocalRows)]
		if err := h.x.Collect(ctx, s.Peer, got); err != nil {
			return err
		}
		for j, row := range s.LocalRows {
			own[row] += got[j]
		}
	}
	return nil
}
