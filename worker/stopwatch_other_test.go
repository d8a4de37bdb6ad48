//go:build !linux

package worker

import "time"

var begun = time.Now()

// cpuSeconds is the time since the program began, for want of a clock of the process.
func cpuSeconds() float64 { return time.Since(begun).Seconds() }
