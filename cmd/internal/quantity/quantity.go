// Package quantity reads the sizes and times of flags and writes them for a
// person: "120MB", "1GiB", "90s", "1h30m".
//
// Bytes are whole numbers; kB, MB, GB, TB are powers of 1000, KiB, MiB, GiB,
// TiB powers of 1024. The package is pure.
package quantity

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"
)

// unit is one suffix and the bytes it stands for.
type unit struct {
	name  string
	bytes float64
}

// units are the suffixes, compared without regard to case. "K", "M", "G" alone
// are left out: they mean different things to different people.
var units = [...]unit{
	{"kib", 1 << 10}, {"mib", 1 << 20}, {"gib", 1 << 30}, {"tib", 1 << 40},
	{"kb", 1e3}, {"mb", 1e6}, {"gb", 1e9}, {"tb", 1e12}, {"b", 1}, {"", 1},
}

// Bytes reads a size such as "120MB", "1.5 GiB" or "4096". It is at least one
// byte and fits an int64.
func Bytes(text string) (int64, error) {
	number := strings.TrimRight(strings.ToLower(strings.TrimSpace(text)), "kmgtib")
	suffix := strings.ToLower(strings.TrimSpace(text))[len(number):]
	value, err := strconv.ParseFloat(strings.TrimSpace(number), 64)
	if err != nil || math.IsNaN(value) || math.IsInf(value, 0) {
		return 0, fmt.Errorf("%q is not a size: write it as 120MB or 1GiB", text)
	}
	for _, u := range units {
		if suffix != u.name {
			continue
		}
		size := math.Floor(value * u.bytes)
		if size < 1 || size >= math.MaxInt64 {
			return 0, fmt.Errorf("%q is not a usable size: it must be at least one byte and below 8EiB", text)
		}
		return int64(size), nil
	}
	return 0, fmt.Errorf("%q has the unit %q: use kB, MB, GB, KiB, MiB or GiB", text, suffix)
}

// Duration reads a time such as "10m", "90s" or "1h30m", always with its unit.
// It is positive.
func Duration(text string) (time.Duration, error) {
	trimmed := strings.TrimSpace(text)
	d, err := time.ParseDuration(trimmed)
	if _, plain := strconv.ParseFloat(trimmed, 64); plain == nil && trimmed != "0" {
		return 0, fmt.Errorf("%q has no unit: write it as %ss or %sm", text, trimmed, trimmed)
	}
	if err != nil {
		return 0, fmt.Errorf("%q is not a time: write it as 90s, 10m or 1h30m", text)
	}
	if d <= 0 {
		return 0, fmt.Errorf("%q is not a usable time: it must be above zero", text)
	}
	return d, nil
}

// Text writes a size with three digits and a unit of 1000: "1.23 GB".
func Text(bytes int64) string {
	value, suffix := float64(bytes), "bytes"
	for _, next := range []string{"kB", "MB", "GB", "TB"} {
		if value < 999.5 {
			break
		}
		value, suffix = value/1000, next
	}
	return strconv.FormatFloat(value, 'g', 3, 64) + " " + suffix
}
