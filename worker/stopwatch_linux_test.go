package worker

import "golang.org/x/sys/unix"

// threadSeconds is the processor time of the calling thread, so that a busy machine
// does not count. The caller has locked its goroutine to the thread.
func threadSeconds() float64 {
	var t unix.Timespec
	if err := unix.ClockGettime(unix.CLOCK_THREAD_CPUTIME_ID, &t); err != nil {
		panic("worker: no thread clock")
	}
	return float64(t.Sec) + 1e-9*float64(t.Nsec)
}
