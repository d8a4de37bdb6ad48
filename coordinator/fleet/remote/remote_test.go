package remote

import (
	"context"
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"

	"rowstead/coordinator/inproc"
	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/proto"
	"rowstead/worker/service"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// office is a hub with workers that run in this process and call over loopback.
type office struct {
	hub     *Hub
	workers []*Worker
	ends    []context.CancelFunc
	ended   []chan error
}

var surroundings = service.Options{
	Peak: func() int64 { return 1 << 20 },
	Free: func() (int64, error) { return 1 << 30, nil },
}

// gather makes an office of so many workers. change, if not nil, may spoil a
// permit before the worker reads it.
func gather(t testing.TB, count int, change func(k int, p *proto.Permit)) *office {
	t.Helper()
	hub, err := Open("127.0.0.1:0", time.Now())
	if err != nil {
		t.Fatal(err)
	}
	o := &office{hub: hub}
	t.Cleanup(o.close)
	for k := range count {
		permit, err := hub.Permit(fmt.Sprintf("worker-%d", k+1), "127.0.0.1:0")
		if err != nil {
			t.Fatal(err)
		}
		if change != nil {
			change(k, permit)
		}
		ctx, cancel := context.WithCancel(context.Background())
		ended := make(chan error, 1)
		go func() { ended <- service.Run(ctx, permit, surroundings) }()
		o.ends, o.ended = append(o.ends, cancel), append(o.ended, ended)
	}
	ctx, cancel := context.WithTimeout(context.Background(), 10*time.Second)
	defer cancel()
	for k := range count {
		w, err := hub.Await(ctx, fmt.Sprintf("worker-%d", k+1))
		if err != nil {
			t.Fatal(err)
		}
		o.workers = append(o.workers, w)
	}
	return o
}

func (o *office) close() {
	o.hub.Close()
	for k, end := range o.ends {
		end()
		if o.ended[k] != nil {
			<-o.ended[k]
		}
	}
}

// build places a suite's problem with so many workers.
func build(t testing.TB, p spacetest.Problem, blocks int, kind string) *Space {
	t.Helper()
	o := gather(t, blocks, nil)
	return o.place(t, p, kind)
}

func (o *office) place(t testing.TB, p spacetest.Problem, kind string) *Space {
	t.Helper()
	ctx := context.Background()
	cuts, err := partition.CutByEntries(p.Matrix.Start, len(o.workers))
	if err != nil {
		t.Fatal(err)
	}
	s, err := New(ctx, o.workers, Problem{Matrix: p.Matrix, RowExponent: p.RowExponent, Cuts: cuts, Right: p.Right, Guess: p.Guess, Threads: 2})
	if err == nil {
		err = s.Prepare(ctx, Preparation{Precondition: kind, Node: 1, Conjugate: p.Symmetric})
	}
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func kindOf(diagonal bool) string {
	if diagonal {
		return "diagonal"
	}
	return "none"
}

func TestSuite(t *testing.T) {
	for _, blocks := range []int{1, 2, 4} {
		if testing.Short() && blocks != 2 {
			continue // under the race detector one number of neighbours is enough
		}
		t.Run(fmt.Sprintf("%d workers", blocks), func(t *testing.T) {
			spacetest.Suite(t, 2500, func(t *testing.T, p spacetest.Problem, diagonal bool) method.Space {
				return build(t, p, blocks, kindOf(diagonal))
			})
			spacetest.ConjugateSuite(t, 2500, func(t *testing.T, p spacetest.Problem, diagonal bool) method.ConjugateSpace {
				return build(t, p, blocks, kindOf(diagonal))
			})
		})
	}
}

// inside is the same in this process.
func inside(t *testing.T, p spacetest.Problem, blocks int, kind string) *inproc.Space {
	t.Helper()
	cuts, err := partition.CutByEntries(p.Matrix.Start, blocks)
	if err != nil {
		t.Fatal(err)
	}
	s, err := inproc.New(inproc.Problem{
		Matrix: p.Matrix, RowExponent: p.RowExponent, Cuts: cuts, Right: p.Right, Guess: p.Guess,
		Precondition: kind, Conjugate: p.Symmetric, Threads: 2,
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	return s
}

// Same cuts, same bits: every number that a Space answers is the one that blocks
// in this process give, in every form of the basis.
func TestBitsOfBlocksInProcess(t *testing.T) {
	for _, blocks := range []int{1, 2, 4} {
		for _, form := range []method.BasisForm{method.Double, method.Single} {
			want := spacetest.Record(t, 9000, form, func(t *testing.T, p spacetest.Problem, _ bool) method.Space {
				return inside(t, p, blocks, "ilu0")
			})
			got := spacetest.Record(t, 9000, form, func(t *testing.T, p spacetest.Problem, _ bool) method.Space {
				return build(t, p, blocks, "ilu0")
			})
			if d := want.Difference(got); d != "" {
				t.Errorf("%d workers, %s: %s", blocks, form, d)
			}
		}
	}
}

func copyOf(m *csr.Matrix) *csr.Matrix {
	c := *m
	c.Start, c.Col, c.Val = append([]int(nil), m.Start...), append([]int32(nil), m.Col...), append([]float64(nil), m.Val...)
	return &c
}

// A whole solve, its answer fetched in chunks, has the bits of the one in
// process; a further right side too.
func TestSolveHasTheSameBits(t *testing.T) {
	ctx := context.Background()
	p := spacetest.Definite(300, 300) // more rows than a chunk
	p.Symmetric = false
	q := p
	q.Matrix = copyOf(p.Matrix)
	far, near := build(t, p, 2, "ilu0"), inside(t, q, 2, "ilu0")
	options := method.Options{Method: method.Sketched, Tolerance: 1e-8, Seed: 3, Form: method.Double}
	for round := range 2 {
		got, err := method.Solve(ctx, far, options)
		if err != nil {
			t.Fatal(err)
		}
		want, err := method.Solve(ctx, near, options)
		if err != nil {
			t.Fatal(err)
		}
		x, err := far.Solution(ctx)
		if err != nil {
			t.Fatal(err)
		}
		for i, v := range near.Solution() {
			if v != x[i] {
				t.Fatalf("round %d: x[%d] = %v over the wire, %v in process", round, i, x[i], v)
			}
		}
		if !got.Met || got.Products != want.Products {
			t.Errorf("round %d: met %v after %d products, in process %d", round, got.Met, got.Products, want.Products)
		}
		right := make([]float64, len(p.Right))
		for i := range right {
			right[i] = float64(i%7) - 3
		}
		near.SetRight(right)
		if err := far.SetRight(ctx, right); err != nil {
			t.Fatal(err)
		}
		near.SetGuess(p.Right)
		if err := far.SetGuess(ctx, p.Right); err != nil {
			t.Fatal(err)
		}
	}
}

// Neighbours that cannot call each other exchange through the coordinator, with
// the same bits, counted and told.
func TestRelay(t *testing.T) {
	record := func(t *testing.T, spoil bool) (*spacetest.Trace, *Space) {
		var s *Space
		trace := spacetest.Record(t, 5000, method.Replay, func(t *testing.T, p spacetest.Problem, _ bool) method.Space {
			o := gather(t, 3, nil)
			for _, w := range o.workers {
				if spoil {
					w.neighbour = "127.0.0.1:1" // nobody listens there
				}
			}
			s = o.place(t, p, "none")
			return s
		})
		return trace, s
	}
	want, plain := record(t, false)
	got, relayed := record(t, true)
	if d := want.Difference(got); d != "" {
		t.Errorf("relayed: %s", d)
	}
	if len(plain.Relayed()) != 0 || len(relayed.Relayed()) == 0 {
		t.Errorf("relayed pairs %v, with spoilt addresses %v", plain.Relayed(), relayed.Relayed())
	}
	held, err := relayed.Held(context.Background())
	if err != nil || held[0].HaloBytes == 0 || held[0].RelayedBytes != held[0].HaloBytes {
		t.Errorf("held %v, %v", held, err)
	}
}

// However a worker goes away, the error of the verb names it and no other.
func TestALostWorkerIsNamed(t *testing.T) {
	for lost := range 3 {
		o := gather(t, 3, nil)
		s := o.place(t, spacetest.Definite(60, 60), "none")
		var all sync.WaitGroup
		all.Go(func() {
			time.Sleep(20 * time.Millisecond)
			o.ends[lost]()
		})
		var err error
		for start := time.Now(); err == nil && time.Since(start) < 5*time.Second; {
			_, err = s.Check(context.Background())
		}
		all.Wait()
		if want := fmt.Sprintf("worker-%d: check", lost+1); err == nil || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("worker %d lost: %v", lost+1, err)
		}
	}
}

// Who has a permit of another run, or one that has been used, is sent away, and
// the run goes on.
func TestStrangersAreSentAway(t *testing.T) {
	o, other := gather(t, 1, nil), gather(t, 1, nil)
	used, err := o.hub.Permit("worker-2", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	stranger, err := other.hub.Permit("worker-2", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	stranger.Address = used.Address
	if err := service.Run(t.Context(), stranger, surroundings); err == nil || !strings.Contains(err.Error(), "certificate") {
		t.Errorf("a permit of another run: %v", err)
	}
	forged := &proto.Permit{Address: used.Address, Name: used.Name, Listen: used.Listen, Authority: used.Authority, Certificate: stranger.Certificate, PrivateKey: stranger.PrivateKey}
	if err := service.Run(t.Context(), forged, surroundings); err == nil {
		t.Error("a certificate of another run: no error")
	}
	ctx, cancel := context.WithCancel(context.Background())
	first := make(chan error, 1)
	go func() { first <- service.Run(ctx, used, surroundings) }()
	if _, err := o.hub.Await(t.Context(), "worker-2"); err != nil {
		t.Fatal(err)
	}
	if err := service.Run(t.Context(), used, surroundings); err == nil || !strings.Contains(err.Error(), "worker-2 is not expected, or has joined before") {
		t.Errorf("a permit that has been used: %v", err)
	}
	cancel()
	if err := <-first; err == nil {
		t.Error("a worker that was ended: no error")
	}
	s := o.place(t, spacetest.Definite(20, 20), "none")
	if _, err := s.Check(t.Context()); err != nil {
		t.Errorf("the run after all that: %v", err)
	}
}
