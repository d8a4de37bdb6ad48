package basis

import (
	"unsafe"

	"golang.org/x/sys/unix"
)

// hugePage is the size of a large page on amd64 and arm64 with 4 KiB base pages.
const hugePage = 2 << 20

// askForHugePages asks the kernel to back a slab that nobody has touched yet with
// large pages: tiles of hundreds of columns otherwise miss in the address cache at
// every column. Only whole large pages inside the slab are asked for. It is advice;
// a kernel that declines changes nothing but speed.
func askForHugePages(slab unsafe.Pointer, bytes int) {
	skip := int(-uintptr(slab) & (hugePage - 1))
	whole := (bytes - skip) &^ (hugePage - 1)
	if whole <= 0 {
		return
	}
	pages := unsafe.Slice((*byte)(unsafe.Add(slab, skip)), whole)
	_ = unix.Madvise(pages, unix.MADV_HUGEPAGE) // only advice
}
