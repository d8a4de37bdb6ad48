package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// running is a program under test with its worker processes.
type running struct {
	t              *testing.T
	dir            string
	cmd            *exec.Cmd
	stdout, stderr bytes.Buffer
	done           chan error
	workers        []int // process numbers, by name
}

// rowstead is the command rowstead, which this test binary becomes under that
// name.
func rowstead(t *testing.T, dir string, args ...string) *exec.Cmd {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command(self, args...)
	c.Args[0] = "rowstead"
	c.Dir = dir
	c.Env = append(os.Environ(), "ROWSTEAD_HOME="+filepath.Join(dir, "home"))
	return c
}

// begin starts a long solve with three worker processes and waits until it steps.
func begin(t *testing.T) *running {
	t.Helper()
	r := &running{t: t, dir: t.TempDir(), done: make(chan error, 1)}
	if text, err := rowstead(t, r.dir, "sample", "wave", "--size", "40000", "--out", "jobs").CombinedOutput(); err != nil {
		t.Fatalf("sample: %v\n%s", err, text)
	}
	r.cmd = rowstead(t, r.dir, "solve", "jobs/wave.mtx", "jobs/wave_rhs.mtx", "--here", "3")
	r.cmd.Stdout, r.cmd.Stderr = &r.stdout, &r.stderr
	if err := r.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { r.cmd.Process.Kill() })
	go func() { r.done <- r.cmd.Wait() }()
	r.until("three workers and a step", func() bool {
		r.workers = children(r.cmd.Process.Pid)
		found, _ := filepath.Glob(filepath.Join(r.dir, "home", "runs", "*", "record.json"))
		if len(found) == 0 || len(r.workers) != 3 {
			return false
		}
		text, _ := os.ReadFile(found[0])
		return steppingState.Match(text)
	})
	return r
}

func (r *running) until(what string, ready func() bool) {
	r.t.Helper()
	for start := time.Now(); !ready(); time.Sleep(20 * time.Millisecond) {
		if time.Since(start) > patience {
			r.t.Fatalf("not %s after %v\n%s", what, patience, r.stderr.String())
		}
	}
}

// end waits for the program and returns its status.
func (r *running) end() int {
	r.t.Helper()
	select {
	case <-r.done:
	case <-time.After(patience):
		r.t.Fatalf("still running after %v", patience)
	}
	return r.cmd.ProcessState.ExitCode()
}

// gone waits until no worker is left.
func (r *running) gone(within time.Duration) {
	r.t.Helper()
	start := time.Now()
	for _, pid := range r.workers {
		for alive(pid) {
			if time.Since(start) > within {
				r.t.Fatalf("worker process %d is still there after %v", pid, within)
			}
			time.Sleep(10 * time.Millisecond)
		}
	}
}

// children are the processes whose parent is pid, ascending.
func children(pid int) []int {
	var out []int
	stats, _ := filepath.Glob("/proc/[0-9]*/stat")
	for _, path := range stats {
		text, err := os.ReadFile(path)
		if err != nil {
			continue
		}
		fields := strings.Fields(string(text[bytes.LastIndexByte(text, ')')+1:])) // state, parent, ...
		child, _ := strconv.Atoi(filepath.Base(filepath.Dir(path)))
		if len(fields) > 1 && fields[1] == fmt.Sprint(pid) {
			out = append(out, child)
		}
	}
	return out
}

// alive says that a process is there and no zombie.
func alive(pid int) bool {
	text, err := os.ReadFile(fmt.Sprintf("/proc/%d/stat", pid))
	if err != nil {
		return false
	}
	fields := strings.Fields(string(text[bytes.LastIndexByte(text, ')')+1:]))
	return len(fields) > 0 && fields[0] != "Z"
}

// A killed worker ends the run with its name, and nothing is left.
func TestKilledWorkerIsNamed(t *testing.T) {
	r := begin(t)
	if err := syscall.Kill(r.workers[1], syscall.SIGKILL); err != nil {
		t.Fatal(err)
	}
	began := time.Now()
	if status := r.end(); status != statusOther {
		t.Errorf("status %d, want %d", status, statusOther)
	}
	t.Logf("ended %v after the kill: %s", time.Since(began).Round(time.Millisecond), r.stderr.String())
	text := r.stderr.String()
	if !strings.Contains(text, "killed") || !strings.Contains(text, fmt.Sprintf("process %d", r.workers[1])) || !strings.Contains(text, "rowstead: worker-") {
		t.Errorf("standard error: %s", text)
	}
	r.gone(0)
	if left, _ := filepath.Glob(filepath.Join(r.dir, "*.part")); len(left) > 0 {
		t.Errorf("left over: %v", left)
	}
}

// Ctrl-C reaches the whole group of a terminal: the answer so far is still kept.
func TestInterruptOfTheWholeGroup(t *testing.T) {
	r := begin(t)
	for _, pid := range append([]int{r.cmd.Process.Pid}, r.workers...) {
		if err := syscall.Kill(pid, syscall.SIGINT); err != nil {
			t.Fatal(err)
		}
	}
	if status := r.end(); status != statusInterrupted {
		t.Errorf("status %d, want %d\n%s", status, statusInterrupted, r.stderr.String())
	}
	r.gone(0)
	if !exists(filepath.Join(r.dir, "x.short.mtx")) {
		t.Errorf("no answer was kept: %s", r.stderr.String())
	}
}

// A second Ctrl-C ends at once, workers included.
func TestSecondInterruptEndsWorkers(t *testing.T) {
	r := begin(t)
	r.cmd.Process.Signal(os.Interrupt)
	time.Sleep(5 * time.Millisecond) // two signals at once are one
	r.cmd.Process.Signal(os.Interrupt)
	if status := r.end(); status != statusInterrupted {
		t.Errorf("status %d, want %d\n%s", status, statusInterrupted, r.stderr.String())
	}
	r.gone(0)
}

// When the coordinator dies its workers end by themselves.
func TestWorkersOfADeadCoordinatorEnd(t *testing.T) {
	r := begin(t)
	if err := r.cmd.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	r.end()
	r.gone(5 * time.Second)
}

// A frozen worker is noticed within six seconds.
func TestFrozenWorkerIsNoticed(t *testing.T) {
	if testing.Short() {
		t.Skip("takes six seconds")
	}
	r := begin(t)
	if err := syscall.Kill(r.workers[0], syscall.SIGSTOP); err != nil {
		t.Fatal(err)
	}
	began := time.Now()
	status := r.end()
	t.Logf("ended %v after the stop: %s", time.Since(began).Round(time.Millisecond), r.stderr.String())
	if text := r.stderr.String(); status != statusOther || !strings.Contains(text, "nothing was heard for five seconds") {
		t.Errorf("status %d: %s", status, text)
	}
	r.gone(0)
}
