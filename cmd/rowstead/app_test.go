package main

import (
	"bytes"
	"encoding/json"
	"os"
	"regexp"
	"strings"
	"testing"
)

// A fault of our own: one line for a person, one object for a program, and the
// details in a file.
func TestCrashIsToldInOneLine(t *testing.T) {
	t.Setenv("TMPDIR", t.TempDir())
	var stdout, stderr bytes.Buffer
	a := newApp([]string{"solve", "A.mtx", "--json"}, &stdout, &stderr)
	a.json = a.object
	if status := a.crashed("index out of range", []byte("goroutine 1 [running]:\nmain.go:1")); status != statusOther {
		t.Errorf("status %d, want %d", status, statusOther)
	}
	line := stderr.String()
	if strings.Count(line, "\n") != 1 || strings.Contains(line, "goroutine") {
		t.Errorf("not one line without a stack: %q", line)
	}
	name := regexp.MustCompile(`\S*rowstead-fault-\S*\.txt`).FindString(line)
	details, err := os.ReadFile(name)
	if err != nil || !strings.Contains(string(details), "index out of range") || !strings.Contains(string(details), "goroutine 1") {
		t.Errorf("details in %q: %s, %v", name, details, err)
	}
	var object map[string]any
	if err := json.Unmarshal(stdout.Bytes(), &object); err != nil || object["verdict"] != "none" || object["error"] == "" {
		t.Errorf("object %s, %v", stdout.Bytes(), err)
	}
}

// Only one object is ever printed.
func TestOneObject(t *testing.T) {
	var stdout bytes.Buffer
	a := newApp(nil, &stdout, &stdout)
	a.sayObject([]byte("{}\n"))
	a.sayObject([]byte("{}\n"))
	if stdout.String() != "{}\n" {
		t.Errorf("printed %q", stdout.String())
	}
}

func TestWantsJSON(t *testing.T) {
	for _, c := range []struct {
		args string
		want bool
	}{{"solve a b --json", true}, {"solve a --json=true", true}, {"solve a", false}, {"solve -- --json", false}, {"", false}} {
		if got := wantsJSON(strings.Fields(c.args)); got != c.want {
			t.Errorf("%q: %v", c.args, got)
		}
	}
}
