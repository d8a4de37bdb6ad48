package memory

import "golang.org/x/sys/unix"

// now counts free, speculative and purgeable pages as usable; where the system
// does not tell them, half of the machine's memory.
func now() (State, error) {
	total, err := unix.SysctlUint64("hw.memsize")
	if err != nil {
		return State{}, ErrUnknown
	}
	s := State{Total: int64(total), Free: int64(total / 2)}
	page, err := unix.SysctlUint32("hw.pagesize")
	if err != nil {
		return s, nil
	}
	var pages int64
	for _, name := range []string{"vm.page_free_count", "vm.page_speculative_count", "vm.page_purgeable_count"} {
		if count, err := unix.SysctlUint32(name); err == nil {
			pages += int64(count)
		}
	}
	// The free list alone says little on a system that keeps files cached: a
	// quarter of the machine is the least that can be had.
	s.Free = max(pages*int64(page), s.Total/4)
	return s, nil
}

func peak() int64 {
	var usage unix.Rusage
	if unix.Getrusage(unix.RUSAGE_SELF, &usage) != nil {
		return 0
	}
	return usage.Maxrss // bytes on this system
}
