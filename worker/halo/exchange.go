// Package halo carries out a halo plan: it brings a row block the entries of x
// that its neighbours own, for A·x, and takes its contributions back to their
// owners, for Aᵀ·x.
//
// Its nouns are Halo, one block's side of the plan, and Exchange, what carries
// blocks of numbers between two row blocks: channels within a process here, a
// network elsewhere. Rows and halo entries are local to the block; peers are
// numbers of row blocks. The package starts no goroutine. A Halo and an
// Exchange belong to one block and serve one call at a time; those of different
// blocks may be used at the same time.
package halo

import "context"

// Exchange is one block's way to its neighbours. Between two blocks, numbers
// arrive in the order in which they were posted.
//
// All blocks first post all they have for a round and then collect all that is
// theirs; then Post never waits for a block that itself waits in the same
// round, and no round can lock up. After an error, a cancelled ctx included,
// the rounds of the blocks may have come apart: the exchange is of no more use,
// for any block.
type Exchange interface {
	// Post hands values to peer. They belong to the exchange until the next Post
	// to the same peer has returned; whoever fills two buffers in turn never
	// writes to one that is still being read. Post may wait until the peer has
	// collected what was posted to it before.
	Post(ctx context.Context, peer int, values []float64) error
	// Collect waits for the next numbers that peer posted to this block and
	// copies them to into. A length other than len(into) is an error.
	Collect(ctx context.Context, peer int, into []float64) error
}
