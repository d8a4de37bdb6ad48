//go:build !linux

package basis

import "unsafe"

// askForHugePages does nothing where there is no such advice.
func askForHugePages(unsafe.Pointer, int) {}
