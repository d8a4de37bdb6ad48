package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"runtime/debug"
	"strings"
	"time"

	"rowstead/cmd/internal/memory"
	"rowstead/cmd/internal/records"
	"rowstead/cmd/internal/replace"
	"rowstead/coordinator"
	"rowstead/coordinator/fleet"
	"rowstead/coordinator/report"
)

// session is one solve from its flags to its exit status, new or carried on.
type session struct {
	flags solveFlags
	asked map[string]string
	run   records.Run    // the folder; none when ID is empty
	old   *report.Record // of the run that is carried on, or nil
	rec   *report.Record
	// opened says that the inputs are good, so that the record may replace that of
	// an earlier try.
	opened bool
}

// solve runs a session and prints its result.
func (a *app) solve(s *session) error {
	if err := s.checkOutputs(); err != nil {
		return err
	}
	s.rec = report.New("solve")
	s.rec.Program, s.rec.Asked = program(), s.asked
	s.rec.Folder, _ = os.Getwd() // only told; an unknown one is empty
	if s.old != nil {
		s.rec.ID, s.rec.Path, s.rec.Resumed = s.old.ID, s.old.Path, s.old.Resumed+1
	}
	a.hold("solve", s.rec, s.flags.job.Out, coordinator.ShortName(s.flags.job.Out))
	keepWithin(s.flags.job.Memory)
	err := coordinator.Run(context.Background(), s.flags.job, a.rim(s), s.rec)
	a.interrupt.gentle.Store(true) // what follows is short and should be whole
	a.screen.clear()
	if err != nil {
		err = s.next(err)
		s.rec.State, s.rec.Error = report.BrokenOff, oneLine(err)
		a.save(s)
		return err
	}
	return a.conclude(s)
}

// next adds to the loss of a worker what can be done about it.
func (s *session) next(err error) error {
	var lost *fleet.MemberError
	switch {
	case !errors.As(err, &lost):
		return err
	case s.run.ID != "" && s.run.HasSnapshot():
		return fmt.Errorf("%w; carry on from the last snapshot with rowstead resume %s", err, s.run.ID)
	}
	return fmt.Errorf("%w; nothing was kept yet, start the run again", err)
}

// keepWithin makes the run-time system collect what is left over before the
// process grows beyond so many bytes; 0 leaves it alone.
func keepWithin(bytes int64) {
	if bytes > 0 {
		debug.SetMemoryLimit(max(bytes-outsideHeap, bytes/2))
	}
}

// outsideHeap is what the process holds that the run-time system does not count,
// its own text above all; measured.
const outsideHeap = 12_000_000

// hold tells the interrupt handler what it may have to clean up and print.
func (a *app) hold(task string, rec *report.Record, outputs ...string) {
	a.mu.Lock()
	defer a.mu.Unlock()
	a.task, a.record, a.outputs = task, rec, outputs
}

// rim is what the coordinator may ask of this program.
func (a *app) rim(s *session) coordinator.Rim {
	return coordinator.Rim{
		Place: a.placer(s.flags.job.Here),
		Now:   time.Now,
		FreeMemory: func() (int64, error) {
			state, err := memory.Now()
			return state.Free, err
		},
		PeakMemory: memory.Peak,
		Phase: func(state string) {
			s.rec.State = state
			a.interrupt.gentle.Store(state == report.Stepping || state == report.Checking)
			a.save(s)
		},
		Opened: func(*report.Record) { a.openRun(s) },
		Progress: func(p report.Progress) {
			if !a.quiet {
				a.screen.tell(p.Sentence(), time.Now())
			}
		},
		Stop: a.interrupt.stop,
		Snapshot: func(done int, x [][]float64) error {
			if s.run.ID == "" {
				return errors.New("there is no folder for records")
			}
			return s.run.SaveSnapshot(records.Snapshot{Done: done, X: x})
		},
	}
}

// openRun makes the folder of the run. Without one the run goes on: the answer
// matters more than its record.
func (a *app) openRun(s *session) {
	s.opened = true
	if s.run.ID != "" {
		a.going(s.run)
		return
	}
	store, err := records.Open(&a.pending)
	if err == nil {
		s.run, err = store.Create(s.rec.Started, stem(s.flags.job.Matrix))
	}
	if err != nil {
		s.run = records.Run{}
		fmt.Fprintf(a.stderr, "rowstead: no record of this run is kept: %s; set %s to a folder that can be written\n", oneLine(err), records.HomeVariable)
		return
	}
	s.rec.ID, s.rec.Path = s.run.ID, s.run.RecordPath()
	a.going(s.run)
}

// going marks the run as one whose process lives, and lets the interrupt handler
// name it.
func (a *app) going(run records.Run) {
	lock, err := run.Hold()
	if err != nil {
		fmt.Fprintf(a.stderr, "rowstead: \"rowstead runs\" cannot tell that this run is going on: %s\n", oneLine(err))
	}
	a.mu.Lock()
	defer a.mu.Unlock()
	a.current, a.lock = run, lock
}

// save writes the record where there is a folder for it and the inputs are known
// to be good.
func (a *app) save(s *session) {
	if s.run.ID == "" || !s.opened {
		return
	}
	if err := s.run.Save(s.rec); err != nil {
		fmt.Fprintf(a.stderr, "rowstead: the record could not be kept: %s\n", oneLine(err))
		s.run, s.rec.ID, s.rec.Path = records.Run{}, "", ""
	}
}

// conclude keeps the record, writes the report and prints the result.
func (a *app) conclude(s *session) error {
	s.rec.State = report.Finished
	status := statusMet
	switch {
	case s.rec.Reason == coordinator.ReasonInterrupted:
		s.rec.State, status = report.BrokenOff, statusInterrupted
	case s.rec.Verdict != report.Met:
		status = statusShort
	}
	if s.run.ID != "" && s.rec.Verdict == report.Met {
		if err := s.run.DropSnapshot(); err != nil {
			fmt.Fprintf(a.stderr, "rowstead: the old snapshot stays: %s\n", oneLine(err))
		}
	}
	if s.rec.Verdict != report.Met && s.run.ID != "" {
		s.rec.Advice = strings.ReplaceAll(s.rec.Advice, "rowstead resume", "rowstead resume "+s.run.ID)
	}
	if s.rec.Verdict == report.Met {
		s.dropShort()
	}
	a.save(s)
	var failed error
	if s.flags.report != "" {
		failed = a.writeReport(s.flags.report, s.rec, s.flags.job.Overwrite)
	}
	if failed != nil { // the verdict is told all the same
		failed = &failure{statusOther, fmt.Errorf("the report could not be written: %w", replace.Plain(failed))}
		s.rec.Error = oneLine(failed)
	}
	a.tell(s.rec)
	if failed != nil {
		return failed
	}
	if status != statusMet {
		return &verdictError{status}
	}
	return nil
}

// tell prints the result: one object, or the summary.
func (a *app) tell(rec *report.Record) {
	switch {
	case a.json:
		a.sayObject(rec.JSON())
	case a.quiet:
		head, _, _ := strings.Cut(rec.Text(), "\n")
		if rec.Job == "solve" && rec.Answer != "" {
			head += " The answer is in " + rec.Answer + "."
			if rec.AnswerNote != "" {
				head += " Beside it: " + rec.AnswerNote + "."
			}
		}
		fmt.Fprintf(a.stdout, "%s %s\n", head, report.Caution)
	default:
		fmt.Fprint(a.stdout, rec.Text())
	}
}

// stem is the name of a file without folder and endings.
func stem(path string) string {
	name, _, _ := strings.Cut(filepath.Base(path), ".")
	return name
}
