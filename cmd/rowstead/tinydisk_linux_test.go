package main

import (
	"os"

	"golang.org/x/sys/unix"
)

// canMount says that this process may mount a file system of its own.
func canMount() bool {
	if os.Geteuid() != 0 {
		return false
	}
	dir, err := os.MkdirTemp("", "tiny")
	if err != nil {
		return false
	}
	defer os.Remove(dir)
	unmount, err := mountTiny(dir, "65536")
	if err != nil {
		return false
	}
	unmount()
	return true
}

// mountTiny mounts a file system of so many bytes on dir.
func mountTiny(dir, size string) (unmount func(), err error) {
	if err := unix.Mount("tmpfs", dir, "tmpfs", 0, "size="+size); err != nil {
		return nil, err
	}
	return func() { unix.Unmount(dir, unix.MNT_DETACH) }, nil
}
