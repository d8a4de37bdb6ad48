//go:build !linux && !darwin && !windows

package memory

func now() (State, error) { return State{}, ErrUnknown }

func peak() int64 { return 0 }
