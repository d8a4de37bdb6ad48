package records

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"time"

	"rowstead/coordinator/report"
)

// goingFile is locked by the process of a run as long as it lives: whatever ends
// the process, the system takes the lock away.
const goingFile = "going"

// Hold locks the run until what it returns is closed or the process ends.
func (r Run) Hold() (io.Closer, error) {
	f, err := os.OpenFile(filepath.Join(r.Folder, goingFile), os.O_CREATE|os.O_RDWR, 0o644)
	if err != nil {
		return nil, err
	}
	err = lock(f)
	for try := 0; try < holdTries && errors.Is(err, errBusy); try++ {
		time.Sleep(holdPause) // somebody may be looking whether the run is alive
		err = lock(f)
	}
	if err != nil {
		f.Close() // nothing was written
		return nil, err
	}
	return f, nil
}

// How often and how long Hold waits for one who only looks.
const (
	holdTries = 10
	holdPause = 5 * time.Millisecond
)

// errBusy says that another one has locked the file.
var errBusy = errors.New("another process holds the run")

// Alive says that some process holds the run; never where files cannot be
// locked.
func (r Run) Alive() bool {
	f, err := os.OpenFile(filepath.Join(r.Folder, goingFile), os.O_RDWR, 0)
	if err != nil {
		return false
	}
	defer f.Close() // nothing was written; ends the lock
	return errors.Is(lock(f), errBusy)
}

// HasSnapshot says that there is an answer to carry on from.
func (r Run) HasSnapshot() bool {
	_, err := os.Stat(r.snapshotPath())
	return err == nil
}

// settle turns the record of a run that says it is going on, but whose process
// is gone, into that of one that is broken off.
func (r Run) settle(record *report.Record) {
	switch record.State {
	case report.Placing, report.Preparing, report.Stepping, report.Checking:
	default:
		return
	}
	if r.Alive() {
		return
	}
	record.State, record.Verdict = report.BrokenOff, report.None
	record.Reason, record.Error = report.BrokenOff, "broken off: its process ended before the run did"
	record.Advice = "solve it anew; there is no snapshot"
	if r.HasSnapshot() {
		record.Advice = "carry on with rowstead resume " + r.ID
	}
}
