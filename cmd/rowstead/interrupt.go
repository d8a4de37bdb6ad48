package main

import (
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync/atomic"

	"rowstead/cmd/internal/records"
	"rowstead/coordinator/report"
)

// interrupt is what the first Ctrl-C sets and the method looks at before every
// step.
type interrupt struct {
	asked atomic.Bool
	// gentle says that something is worth keeping: a run is stepping, or its
	// answer is being checked and written.
	gentle atomic.Bool
	// ending says that the program is being ended: what fails from now on, such as
	// a run whose workers have been killed, is not told.
	ending atomic.Bool
}

// Stop is method.Options.Stop.
func (i *interrupt) stop() string {
	if i.asked.Load() {
		return interruptedText
	}
	return ""
}

const interruptedText = "interrupted"

// watch ends the program on signals: the first lets a run that has an answer
// keep it, the second, or the first when there is nothing to keep, ends at once
// without half-written files. exit is os.Exit.
func (a *app) watch(signals <-chan os.Signal, exit func(int)) {
	for range signals {
		if a.interrupt.gentle.Load() && !a.interrupt.asked.Swap(true) {
			a.screen.clear()
			fmt.Fprintln(a.stderr, "rowstead: stopping after this step to keep the answer so far; once more ends at once")
			continue
		}
		a.interrupt.ending.Store(true)
		a.abandon()
		a.screen.clear()
		text, run := a.farewell()
		fmt.Fprintln(a.stderr, "rowstead: "+text)
		if a.object {
			r := report.New("solve")
			r.Reason, r.Error = interruptedText, text
			if run.ID != "" {
				r.ID, r.Path = run.ID, run.RecordPath()
			}
			a.sayObject(r.JSON())
		}
		exit(statusInterrupted)
		return
	}
}

// farewell says what an interrupt at once leaves behind, and which run is broken
// off by it.
func (a *app) farewell() (text string, run records.Run) {
	a.mu.Lock()
	defer a.mu.Unlock()
	switch {
	case len(a.written) > 0:
		return "interrupted; written so far: " + strings.Join(a.written, ", "), run
	case a.task != "solve":
		return "interrupted; nothing was written", run
	case a.current.ID == "":
		return "interrupted before there was an answer to keep; nothing was left half-written", run
	}
	text = fmt.Sprintf("interrupted; nothing was left half-written; run %s is broken off", a.current.ID)
	if a.current.HasSnapshot() {
		text += "; carry on with rowstead resume " + a.current.ID
	}
	return text, a.current
}

// abandon ends worker processes and removes what is half-written: files of our
// own writer, and the temporary ones beside the outputs, which are named after
// them.
func (a *app) abandon() {
	a.pending.Abandon()
	a.mu.Lock()
	outputs := append([]string(nil), a.outputs...)
	office := a.office
	a.mu.Unlock()
	if office != nil {
		office.Kill()
	}
	for _, path := range outputs {
		parts, err := filepath.Glob(escape(path) + ".????????.part")
		if err != nil {
			continue // a name that is no pattern has no such files
		}
		for _, part := range parts {
			os.Remove(part) // nothing more can be done about one that stays
		}
	}
}

// escape makes a path a pattern that matches itself alone.
func escape(path string) string {
	if runtime.GOOS == "windows" {
		return path
	}
	return strings.NewReplacer(`\`, `\\`, "*", `\*`, "?", `\?`, "[", `\[`).Replace(path)
}
