//go:build !windows

package records

import (
	"os"
	"syscall"
)

// lock takes the file for this process alone, or fails at once.
func lock(f *os.File) error {
	return syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
}
