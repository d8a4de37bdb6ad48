//go:build !windows

package records

import (
	"errors"
	"os"
	"syscall"
)

// lock takes the file for this process alone, or fails at once.
func lock(f *os.File) error {
	err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
	if errors.Is(err, syscall.EWOULDBLOCK) {
		return errBusy
	}
	return err
}
