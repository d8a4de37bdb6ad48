package memory

import (
	"bytes"
	"os"
	"path/filepath"
	"strconv"
	"strings"
)

func now() (State, error) {
	text, err := os.ReadFile("/proc/meminfo")
	if err != nil {
		return State{}, ErrUnknown
	}
	s := State{Total: field(text, "MemTotal:"), Free: field(text, "MemAvailable:")}
	if s.Free == 0 {
		s.Free = field(text, "MemFree:") + field(text, "Cached:")
	}
	if s.Total == 0 || s.Free == 0 {
		return State{}, ErrUnknown
	}
	return groupLimit(s), nil
}

func peak() int64 {
	text, err := os.ReadFile("/proc/self/status")
	if err != nil {
		return 0
	}
	return field(text, "VmHWM:")
}

// field returns the kB value that follows name at the beginning of a line, in
// bytes; 0 where there is none.
func field(text []byte, name string) int64 {
	for line := range bytes.Lines(text) {
		rest, found := bytes.CutPrefix(line, []byte(name))
		if !found {
			continue
		}
		words := strings.Fields(string(rest))
		if len(words) == 0 {
			return 0
		}
		kib, err := strconv.ParseInt(words[0], 10, 64)
		if err != nil {
			return 0
		}
		return kib << 10
	}
	return 0
}

// groupLimit narrows s to the limits of this process's control groups (version
// 2, with the older layout's one file as second try).
func groupLimit(s State) State {
	text, err := os.ReadFile("/proc/self/cgroup")
	if err != nil {
		return s
	}
	for line := range strings.Lines(string(text)) {
		parts := strings.SplitN(strings.TrimSpace(line), ":", 3)
		if len(parts) != 3 {
			continue
		}
		if parts[1] == "" {
			for path := parts[2]; ; path = filepath.Dir(path) {
				folder := filepath.Join("/sys/fs/cgroup", path)
				s = narrow(s, filepath.Join(folder, "memory.max"), filepath.Join(folder, "memory.current"))
				if path == "/" || path == "." {
					break
				}
			}
		}
		if parts[1] == "memory" {
			folder := filepath.Join("/sys/fs/cgroup/memory", parts[2])
			s = narrow(s, filepath.Join(folder, "memory.limit_in_bytes"), filepath.Join(folder, "memory.usage_in_bytes"))
		}
	}
	return s
}

// narrow applies one limit file and its usage file.
func narrow(s State, limitFile, usedFile string) State {
	limit, used := number(limitFile), number(usedFile)
	if limit <= 0 || limit >= s.Total {
		return s
	}
	s.Total = limit
	s.Free = min(s.Free, max(limit-used, 1))
	return s
}

// number reads a file of one number, 0 for anything else ("max", no file).
func number(path string) int64 {
	text, err := os.ReadFile(path)
	if err != nil {
		return 0
	}
	n, err := strconv.ParseInt(strings.TrimSpace(string(text)), 10, 64)
	if err != nil {
		return 0
	}
	return n
}
