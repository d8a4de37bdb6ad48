// Package fleet makes one method.Space and method.ConjugateSpace of many
// members, each of which holds one row block. A verb goes to all members at
// once; what comes back are partial sums, which are added in the order of the
// blocks, never in order of arrival, so that the same cuts give the same bits.
//
// Its noun is the Member, one row block wherever it lives. Rows are global and
// half-open ranges. Verbs are called one at a time; every goroutine a verb starts
// has ended when the verb returns. The package keeps nothing of the length of the
// problem and knows nothing of clocks and networks: deadlines come in ctx.
package fleet

import (
	"context"
	"errors"
	"fmt"
	"sync"

	"rowstead/coordinator/method"
)

// Member carries out the verbs of a Space on one row block. The meaning of every
// verb is that of method.Space and method.ConjugateSpace with sums over the
// member's rows alone; exchanging halos is the members' own affair. Slices in an
// answer stay valid until the member's next verb. A member must return soon after
// ctx ends, for it may wait for the halo of a member that has failed.
type Member interface {
	// Name is how people know the member.
	Name() string
	// Range returns its rows [lo, hi).
	Range() (lo, hi int)

	Start(ctx context.Context, c method.Cycle) (ResidualSums, error)
	Advance(ctx context.Context, s method.Step) (StepSums, error)
	Sketches(ctx context.Context, from, to int) (SketchSums, error)
	Reduce(ctx context.Context, h []float64) (DotSums, error)
	Try(ctx context.Context, c method.Correction) (ResidualSums, error)
	Correct(ctx context.Context, c method.Correction) (ResidualSums, error)
	Keep(ctx context.Context) error
	Recycle(ctx context.Context, next method.Cycle) (RecycleSums, error)
	Forget(ctx context.Context) error
	Check(ctx context.Context) (ResidualSums, error)
	Gradient(ctx context.Context) (PairSums, error)
	Probe(ctx context.Context, c method.Correction) (PairSums, error)

	StartConjugate(ctx context.Context) (ConjugateSums, error)
	Direct(ctx context.Context, beta float64) (ConjugateSums, error)
	Move(ctx context.Context, alpha float64) (ConjugateSums, error)
}

// MemberError says which member failed at what, and which rows wait for it.
type MemberError struct {
	Member string // its name
	Op     string // "start", "advance", ...
	Lo, Hi int    // its rows, [Lo, Hi)
	Err    error
}

// Error names the member, the verb and the rows, counted from 1.
func (e *MemberError) Error() string {
	return fmt.Sprintf("%s: %s, rows %d to %d: %v", e.Member, e.Op, e.Lo+1, e.Hi, e.Err)
}

// Unwrap returns the member's own error.
func (e *MemberError) Unwrap() error { return e.Err }

// ErrRefused is wrapped by the error of a member that did not begin a verb because
// it is not allowed as things stand.
var ErrRefused = errors.New("refused")

// ErrApart is wrapped by the errors of all verbs after one has failed halfway: the
// halos of the members are of different verbs then, and what they computed with
// them would be wrong without a sign.
var ErrApart = errors.New("the row blocks have come apart")

// Space is a method.Space and a method.ConjugateSpace over members.
type Space struct {
	members []Member
	rows    int
	apart   error // the failure after which no verb is sent; nil: none
	stepped method.Stepped
	sb, sh  []float64 // what Sketches last returned
}

// New returns the Space over members in the order of their rows. It is an error
// if their rows are not contiguous from 0.
func New(members []Member) (*Space, error) {
	if len(members) == 0 {
		return nil, fmt.Errorf("fleet: no members")
	}
	next := 0
	for _, m := range members {
		lo, hi := m.Range()
		if lo != next || hi < lo {
			return nil, fmt.Errorf("fleet: %s holds rows [%d, %d), expected a block from row %d", m.Name(), lo, hi, next)
		}
		next = hi
	}
	return &Space{members: members, rows: next}, nil
}

// Rows is the number of unknowns.
func (f *Space) Rows() int { return f.rows }

// fanOut calls one verb on every member, each in a goroutine of its own, waits
// for all and returns the answers in block order. The first failure cancels the
// others. The error is that of the first member in block order that did not
// merely see the cancellation.
func fanOut[T any](ctx context.Context, f *Space, op string, call func(context.Context, Member) (T, error)) ([]T, error) {
	if f.apart != nil {
		return nil, fmt.Errorf("%s: %w: %w", op, ErrApart, f.apart)
	}
	answers := make([]T, len(f.members))
	failures := make([]error, len(f.members))
	if len(f.members) == 1 {
		answers[0], failures[0] = call(ctx, f.members[0])
		return answers, f.failure(ctx, op, failures)
	}
	inner, cancel := context.WithCancel(ctx)
	defer cancel()
	var all sync.WaitGroup
	for i, m := range f.members {
		all.Go(func() {
			if answers[i], failures[i] = call(inner, m); failures[i] != nil {
				cancel()
			}
		})
	}
	all.Wait()
	return answers, f.failure(ctx, op, failures)
}

// failure picks the error that caused the others. When the caller's ctx ended,
// every member only follows it and the first in order stands for all.
// Unless every member refused the verb, they have come apart.
func (f *Space) failure(ctx context.Context, op string, failures []error) error {
	err := f.cause(ctx, op, failures)
	if err == nil {
		return nil
	}
	for _, e := range failures {
		if !errors.Is(e, ErrRefused) {
			f.apart = err
		}
	}
	return err
}

// cause is the error that stands for all.
func (f *Space) cause(ctx context.Context, op string, failures []error) error {
	var followed error
	for i, err := range failures {
		if err == nil {
			continue
		}
		named := f.memberError(i, op, err)
		if ctx.Err() == nil && isCanceled(err) {
			if followed == nil {
				followed = named
			}
			continue
		}
		return named
	}
	return followed
}

// ElsewhereError is the failure of another member than the one whose verb
// noticed it, as when a neighbour's halo stays away.
type ElsewhereError struct {
	Block int // of the member that failed
	Err   error
}

func (e *ElsewhereError) Error() string { return e.Err.Error() }
func (e *ElsewhereError) Unwrap() error { return e.Err }

func (f *Space) memberError(i int, op string, err error) error {
	var elsewhere *ElsewhereError
	if errors.As(err, &elsewhere) {
		i, err = elsewhere.Block, elsewhere.Err
	}
	lo, hi := f.members[i].Range()
	return &MemberError{Member: f.members[i].Name(), Op: op, Lo: lo, Hi: hi, Err: err}
}

// do is fanOut for verbs without an answer.
func (f *Space) do(ctx context.Context, op string, call func(context.Context, Member) error) error {
	_, err := fanOut(ctx, f, op, func(ctx context.Context, m Member) (struct{}, error) {
		return struct{}{}, call(ctx, m)
	})
	return err
}
