package main

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"rowstead": main})
}

// The command line, tried as a person uses it. Commands of the scripts beside
// the usual ones:
//
//	status N rowstead ...    the exit status is N
//	object KEY VALUE ...     standard output is one JSON object with every key of the contract, and these values
//	oneline                  standard error is one line of ours
//	nofiles PATTERN ...      no file has such a name
//	interrupt N rowstead ... starts it, sends N interrupts once it is stepping; the status is 130
//	killed rowstead ...      starts it and kills it once it has a snapshot
//	lastrun                  sets $RUN to the last run of the list in standard output
//	tinydisk DIR BYTES       a full disk, where condition [tinydisk] holds
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir: "testdata/script",
		Setup: func(e *testscript.Env) error {
			e.Setenv("ROWSTEAD_HOME", filepath.Join(e.WorkDir, "home"))
			return nil
		},
		Condition: condition,
		Cmds: map[string]func(ts *testscript.TestScript, neg bool, args []string){
			"status": scriptStatus, "object": scriptObject, "oneline": scriptOneLine, "nofiles": scriptNoFiles,
			"interrupt": scriptInterrupt, "tinydisk": scriptTinyDisk, "killed": scriptKilled, "lastrun": scriptLastRun,
		},
	})
}

// condition tells scripts what this machine can do.
func condition(name string) (bool, error) {
	switch name {
	case "tinydisk":
		return canMount(), nil
	case "signals":
		return runtime.GOOS != "windows", nil
	case "root":
		return os.Geteuid() == 0, nil
	}
	return false, fmt.Errorf("unknown condition %q", name)
}

func scriptStatus(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: status N program ...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	if got := exitStatus(ts, ts.Exec(args[1], args[2:]...)); got != want {
		ts.Fatalf("status %d, want %d", got, want)
	}
}

func exitStatus(ts *testscript.TestScript, err error) int {
	var exit *exec.ExitError
	switch {
	case err == nil:
		return 0
	case errors.As(err, &exit):
		return exit.ExitCode()
	}
	ts.Fatalf("%v", err)
	return -1
}

// contract are the keys that every object has.
var contract = strings.Fields(`verdict reason error rows columns entries method precondition cuts row_base workers tolerance
	true_residual scaled_residual rowwise_error backward_error condition_hint forward_error steps full_steps
	cycles products seconds traffic coordinator_peak_bytes seed answer record`)

func scriptObject(ts *testscript.TestScript, neg bool, args []string) {
	text := ts.ReadFile("stdout")
	decoder := json.NewDecoder(strings.NewReader(text))
	var object map[string]json.RawMessage
	if err := decoder.Decode(&object); err != nil {
		ts.Fatalf("standard output is no object: %v\n%s", err, text)
	}
	if rest := strings.TrimSpace(text[decoder.InputOffset():]); rest != "" {
		ts.Fatalf("something follows the object: %q", rest)
	}
	for _, key := range contract {
		if _, there := object[key]; !there {
			ts.Fatalf("key %s is missing in %s", key, text)
		}
	}
	for i := 0; i+1 < len(args); i += 2 {
		if got := strings.Trim(string(object[args[i]]), `"`); got != args[i+1] {
			ts.Fatalf("%s is %s, want %s\n%s", args[i], got, args[i+1], text)
		}
	}
}

func scriptOneLine(ts *testscript.TestScript, neg bool, args []string) {
	text := ts.ReadFile("stderr")
	if !strings.HasPrefix(text, "rowstead: ") || strings.Count(text, "\n") != 1 || !strings.HasSuffix(text, "\n") {
		ts.Fatalf("not one line of ours: %q", text)
	}
	for _, bad := range []string{"goroutine", "panic", ".go:", "%!"} {
		if strings.Contains(text, bad) {
			ts.Fatalf("%q in %q", bad, text)
		}
	}
}

func scriptNoFiles(ts *testscript.TestScript, neg bool, args []string) {
	for _, pattern := range args {
		found, err := filepath.Glob(ts.MkAbs(pattern))
		ts.Check(err)
		if len(found) > 0 {
			ts.Fatalf("left over: %v", found)
		}
	}
}

// patience is how long a started program may take to do what it was asked.
const patience = 60 * time.Second

// scriptInterrupt starts the program, waits until its record says that it is
// stepping, and interrupts that one process.
func scriptInterrupt(ts *testscript.TestScript, neg bool, args []string) {
	count, err := strconv.Atoi(args[0])
	ts.Check(err)
	var stdout, stderr bytes.Buffer
	c, done := background(ts, args[1:], &stdout, &stderr)
	waitFor(ts, done, func() bool { return stepping(ts) })
	for range count {
		ts.Check(c.Process.Signal(os.Interrupt))
		time.Sleep(5 * time.Millisecond) // two signals at once are one
	}
	select {
	case err = <-done:
	case <-time.After(patience):
		c.Process.Kill()
		ts.Fatalf("still running after %v", patience)
	}
	ts.Logf("%s%s", stdout.String(), stderr.String())
	if got := exitStatus(ts, err); got != statusInterrupted {
		ts.Fatalf("status %d, want %d", got, statusInterrupted)
	}
	ts.Check(os.WriteFile(ts.MkAbs("out.json"), stdout.Bytes(), 0o644))
	ts.Check(os.WriteFile(ts.MkAbs("err.txt"), stderr.Bytes(), 0o644))
}

// background starts a program; done gives how it ended.
func background(ts *testscript.TestScript, args []string, stdout, stderr *bytes.Buffer) (c *exec.Cmd, done chan error) {
	path, err := exec.LookPath(args[0])
	ts.Check(err)
	c = exec.Command(path, args[1:]...)
	c.Dir = ts.MkAbs(".")
	c.Env = append(os.Environ(), "ROWSTEAD_HOME="+ts.Getenv("ROWSTEAD_HOME"))
	c.Stdout, c.Stderr = stdout, stderr
	ts.Check(c.Start())
	done = make(chan error, 1)
	go func() { done <- c.Wait() }()
	return c, done
}

// scriptLastRun takes the identifier from what "runs --json" has printed.
func scriptLastRun(ts *testscript.TestScript, neg bool, args []string) {
	var list struct{ Runs []struct{ ID string } }
	ts.Check(json.Unmarshal([]byte(ts.ReadFile("stdout")), &list))
	if len(list.Runs) == 0 {
		ts.Fatalf("there are no runs")
	}
	ts.Setenv("RUN", list.Runs[len(list.Runs)-1].ID)
}

// scriptKilled starts the program, waits until it has a snapshot, and kills that
// one process.
func scriptKilled(ts *testscript.TestScript, neg bool, args []string) {
	var stdout, stderr bytes.Buffer
	c, done := background(ts, args, &stdout, &stderr)
	waitFor(ts, done, func() bool {
		found, _ := filepath.Glob(filepath.Join(ts.Getenv("ROWSTEAD_HOME"), "runs", "*", "snapshot"))
		return len(found) > 0 && stepping(ts)
	})
	ts.Check(c.Process.Kill())
	<-done
}

// waitFor polls until ready, and fails when the program ends before.
func waitFor(ts *testscript.TestScript, done <-chan error, ready func() bool) {
	deadline := time.Now().Add(patience)
	for !ready() {
		select {
		case err := <-done:
			ts.Fatalf("ended before it was interrupted: %v", err)
		case <-time.After(20 * time.Millisecond):
		}
		if time.Now().After(deadline) {
			ts.Fatalf("not stepping after %v", patience)
		}
	}
}

var steppingState = regexp.MustCompile(`"State": "stepping"`)

// stepping says that some record is of a run that iterates.
func stepping(ts *testscript.TestScript) bool {
	found, _ := filepath.Glob(filepath.Join(ts.Getenv("ROWSTEAD_HOME"), "runs", "*", "record.json"))
	for _, path := range found {
		if text, err := os.ReadFile(path); err == nil && steppingState.Match(text) {
			return true
		}
	}
	return false
}

func scriptTinyDisk(ts *testscript.TestScript, neg bool, args []string) {
	dir := ts.MkAbs(args[0])
	ts.Check(os.MkdirAll(dir, 0o755))
	unmount, err := mountTiny(dir, args[1])
	ts.Check(err)
	ts.Defer(unmount)
}
