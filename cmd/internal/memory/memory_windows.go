package memory

import (
	"unsafe"

	"golang.org/x/sys/windows"
)

// statusEx is the MEMORYSTATUSEX of the system's documentation.
type statusEx struct {
	length, load                uint32
	totalPhysical, freePhysical uint64
	totalPageFile, freePageFile uint64
	totalVirtual, freeVirtual   uint64
	freeExtendedVirtual         uint64
}

func now() (State, error) {
	call := windows.NewLazySystemDLL("kernel32.dll").NewProc("GlobalMemoryStatusEx")
	status := statusEx{}
	status.length = uint32(unsafe.Sizeof(status))
	if done, _, _ := call.Call(uintptr(unsafe.Pointer(&status))); done == 0 {
		return State{}, ErrUnknown
	}
	return State{Total: int64(status.totalPhysical), Free: int64(status.freePhysical)}, nil
}

// counters is the PROCESS_MEMORY_COUNTERS of the system's documentation.
type counters struct {
	size, pageFaults                                         uint32
	peakWorkingSet, workingSet                               uintptr
	peakPagedPool, pagedPool, peakNonPagedPool, nonPagedPool uintptr
	pageFile, peakPageFile                                   uintptr
}

func peak() int64 {
	call := windows.NewLazySystemDLL("kernel32.dll").NewProc("K32GetProcessMemoryInfo")
	c := counters{}
	c.size = uint32(unsafe.Sizeof(c))
	done, _, _ := call.Call(uintptr(windows.CurrentProcess()), uintptr(unsafe.Pointer(&c)), uintptr(c.size))
	if done == 0 {
		return 0
	}
	return int64(c.peakWorkingSet)
}
