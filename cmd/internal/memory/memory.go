// Package memory asks the operating system how much memory is free and how much
// this process has used. Sizes are bytes. It holds no state.
package memory

import "errors"

// ErrUnknown says that this system does not tell.
var ErrUnknown = errors.New("this system does not say how much memory is free")

// State is what the system tells of its memory.
type State struct {
	Total int64 // of the machine, or of the limit this process lives under
	Free  int64 // that could be used without swapping
}

// Now returns the memory of this moment, bounded by the limit of this
// process where the system sets one (a control group on Linux).
func Now() (State, error) { return now() }

// Peak returns the largest resident size of this process so far, 0 where the
// system does not tell.
func Peak() int64 { return peak() }
