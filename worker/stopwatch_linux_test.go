package worker

import "golang.org/x/sys/unix"

// cpuSeconds is the processor time of this process, so that a busy machine does not
// count; the benchmarks run one goroutine.
func cpuSeconds() float64 {
	var t unix.Timespec
	if err := unix.ClockGettime(unix.CLOCK_PROCESS_CPUTIME_ID, &t); err != nil {
		panic("worker: no clock of the process")
	}
	return float64(t.Sec) + 1e-9*float64(t.Nsec)
}
