//go:build !linux

package worker

import "time"

var begun = time.Now()

// threadSeconds is the time since the program began, where threads have no clock.
func threadSeconds() float64 { return time.Since(begun).Seconds() }
