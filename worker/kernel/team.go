package kernel

import (
	"sync"
	"sync/atomic"
)

// Team is a fixed set of goroutines that share the strips of one task at a
// time. The one who calls Run works along, so a team of one starts none. Run
// and Close are called one at a time.
type Team struct {
	helpers int
	wake    chan struct{} // one token a helper and task; closed by Close
	done    sync.WaitGroup

	// The task in hand; written before the tokens go out, read after one is taken.
	task  func(i int)
	count int64
	next  atomic.Int64
	fault atomic.Pointer[fault]
}

// fault carries a panic of a helper to the caller of Run.
type fault struct{ value any }

// NewTeam starts threads−1 goroutines that wait for work until Close. threads
// below one count as one.
func NewTeam(threads int) *Team {
	t := &Team{helpers: max(threads, 1) - 1}
	t.wake = make(chan struct{}, t.helpers)
	for range t.helpers {
		go t.help()
	}
	return t
}

// Threads is the number of goroutines that work on a task, the caller included.
func (t *Team) Threads() int { return t.helpers + 1 }

// Run calls f(0), …, f(n−1), each once, several at a time and in no certain
// order, and returns when all have returned. What f sums it keeps by i. A panic
// of f is raised again in the caller, after the others have ended. Run itself
// allocates nothing.
func (t *Team) Run(n int, f func(i int)) {
	if t.helpers == 0 || n <= 1 {
		for i := range n {
			f(i)
		}
		return
	}
	t.task, t.count = f, int64(n)
	t.next.Store(0)
	t.fault.Store(nil)
	awake := min(t.helpers, n-1)
	t.done.Add(awake)
	for range awake {
		t.wake <- struct{}{}
	}
	t.work()
	t.done.Wait()
	t.task = nil
	if bad := t.fault.Load(); bad != nil {
		panic(bad.value)
	}
}

// Close ends the goroutines. The team cannot be used again.
func (t *Team) Close() { close(t.wake) }

func (t *Team) help() {
	for range t.wake {
		t.work()
		t.done.Done()
	}
}

// work takes strips until none is left, or until f panics somewhere.
func (t *Team) work() {
	defer func() {
		if v := recover(); v != nil {
			t.fault.CompareAndSwap(nil, &fault{v})
			t.next.Store(t.count)
		}
	}()
	for {
		i := t.next.Add(1) - 1
		if i >= t.count {
			return
		}
		t.task(int(i))
	}
}
