package halo

import (
	"context"
	"errors"
	"strings"
	"sync/atomic"
	"testing"
	"testing/synctest"

	"rowstead/partition/csr"
)

// A block whose neighbour never comes waits until ctx ends, in Post as in
// Collect, and no longer.
func TestWaitingEndsWithTheContext(t *testing.T) {
	waits := map[string]func(ctx context.Context, x Exchange) error{
		"collect": func(ctx context.Context, x Exchange) error { return x.Collect(ctx, 1, make([]float64, 1)) },
		"post": func(ctx context.Context, x Exchange) error {
			if err := x.Post(ctx, 1, []float64{1}); err != nil {
				return err
			}
			return x.Post(ctx, 1, []float64{2})
		},
	}
	for name, wait := range waits {
		t.Run(name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				ctx, cancel := context.WithCancel(t.Context())
				done := make(chan error, 1)
				go func() { done <- wait(ctx, NewLocal(2)[0]) }()
				synctest.Wait()
				select {
				case err := <-done:
					t.Fatalf("did not wait for the neighbour: %v", err)
				default:
				}
				cancel()
				if err := <-done; !errors.Is(err, context.Canceled) || !strings.Contains(err.Error(), "row block 0") {
					t.Fatalf("error %v, want a cancelled context of row block 0", err)
				}
			})
		})
	}
}

func TestCancelledContextIsSeenWithoutWaiting(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	x := NewLocal(2)
	if err := x[0].Post(ctx, 1, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("Post: error %v", err)
	}
	if err := x[0].Collect(ctx, 1, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("Collect: error %v", err)
	}
}

func TestCollectRefusesAnotherLength(t *testing.T) {
	x := NewLocal(2)
	if err := x[0].Post(t.Context(), 1, make([]float64, 3)); err != nil {
		t.Fatal(err)
	}
	if err := x[1].Collect(t.Context(), 0, make([]float64, 2)); err == nil || !strings.Contains(err.Error(), "3 numbers came; want 2") {
		t.Errorf("Collect of 3 numbers into 2: error %v", err)
	}
}

// A buffer is not read any more once the next Post has returned.
func TestNextPostFreesTheBuffer(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		x := NewLocal(2)
		got := make([]float64, 1)
		buffer := []float64{1}
		if err := x[0].Post(t.Context(), 1, buffer); err != nil {
			t.Fatal(err)
		}
		returned := make(chan error, 1)
		go func() { returned <- x[0].Post(t.Context(), 1, []float64{2}) }()
		synctest.Wait()
		if len(returned) != 0 {
			t.Fatal("the second Post returned while the first buffer was unread")
		}
		if err := x[1].Collect(t.Context(), 0, got); err != nil || got[0] != 1 {
			t.Fatalf("Collect = %v, %v", got, err)
		}
		if err := <-returned; err != nil {
			t.Fatal(err)
		}
		buffer[0] = 3
		if err := x[1].Collect(t.Context(), 0, got); err != nil || got[0] != 2 {
			t.Fatalf("Collect = %v, %v", got, err)
		}
	})
}

var errCable = errors.New("cable pulled")

// failing fails the k-th call of all blocks together, and takes the others' ctx
// away as a caller would.
type failing struct {
	Exchange
	left   *atomic.Int64
	cancel context.CancelFunc
}

func (f failing) fail() bool {
	if f.left.Add(-1) != 0 {
		return false
	}
	f.cancel()
	return true
}

func (f failing) Post(ctx context.Context, peer int, values []float64) error {
	if f.fail() {
		return errCable
	}
	return f.Exchange.Post(ctx, peer, values)
}

func (f failing) Collect(ctx context.Context, peer int, into []float64) error {
	if f.fail() {
		return errCable
	}
	return f.Exchange.Collect(ctx, peer, into)
}

// Whichever call fails, all blocks return and the failure is told.
func TestEveryCallMayFail(t *testing.T) {
	var entries csr.Triplets
	for i := range 32 {
		entries.Add(i, (i+8)%32, 1)
		entries.Add(i, (i+16)%32, 1)
	}
	m := entries.Matrix(32, 32)
	for k := int64(1); ; k++ {
		ctx, cancel := context.WithCancel(t.Context())
		left := &atomic.Int64{}
		left.Store(k)
		c, err := newCutMatrix(m, 4, func(all []Exchange) []Exchange {
			for p := range all {
				all[p] = failing{all[p], left, cancel}
			}
			return all
		})
		if err != nil {
			t.Fatal(err)
		}
		y := make([]float64, 32)
		err = c.mul(ctx, y, y)
		if err == nil {
			err = c.mulT(ctx, y, y)
		}
		cancel()
		if left.Load() > 0 {
			if err != nil {
				t.Fatalf("no call failed, but: %v", err)
			}
			if k < 17 {
				t.Fatalf("only %d calls in two rounds of four blocks with two neighbours", k)
			}
			return
		}
		if !errors.Is(err, errCable) {
			t.Fatalf("call %d failed, but the error is %v", k, err)
		}
	}
}
