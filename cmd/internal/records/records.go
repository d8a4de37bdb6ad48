// Package records keeps the runs folder: one folder a run, named by its
// identifier, with the record and, until the run has met its tolerance, a
// snapshot of the answer so far.
//
// The folder is ROWSTEAD_HOME, or rowstead in the user's state folder
// (XDG_STATE_HOME or ~/.local/state on Linux, ~/Library/Application Support on
// macOS, LocalAppData on Windows). Files are replaced whole. A Store may be used
// from many goroutines and many processes.
package records

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"sort"
	"strings"
	"time"

	"rowstead/cmd/internal/replace"
	"rowstead/coordinator/report"
)

// HomeVariable overrides the folder.
const HomeVariable = "ROWSTEAD_HOME"

const (
	recordFile   = "record.json"
	snapshotFile = "snapshot"
)

// Store is the runs folder.
type Store struct {
	root    string // .../runs
	pending *replace.Pending
}

// Run is the folder of one run.
type Run struct {
	ID      string
	Folder  string
	pending *replace.Pending
}

// Open finds the runs folder; it is made when the first run is. Files grow as
// pending ones of p.
func Open(p *replace.Pending) (Store, error) {
	home := os.Getenv(HomeVariable)
	if home == "" {
		state, err := stateFolder()
		if err != nil {
			return Store{}, fmt.Errorf("no folder for records: %w; set %s", err, HomeVariable)
		}
		home = filepath.Join(state, "rowstead")
	}
	root, err := filepath.Abs(filepath.Join(home, "runs"))
	return Store{root: root, pending: p}, err
}

// stateFolder is where this system's programs keep what they may lose last.
func stateFolder() (string, error) {
	switch runtime.GOOS {
	case "windows", "darwin", "ios":
		if local := os.Getenv("LocalAppData"); local != "" && runtime.GOOS == "windows" {
			return local, nil
		}
		return os.UserConfigDir()
	}
	if state := os.Getenv("XDG_STATE_HOME"); filepath.IsAbs(state) {
		return state, nil
	}
	home, err := os.UserHomeDir()
	return filepath.Join(home, ".local", "state"), err
}

// Create makes the folder of a new run, named by its start and a name that says
// what is solved.
func (s Store) Create(started time.Time, name string) (Run, error) {
	if err := os.MkdirAll(s.root, 0o755); err != nil {
		return Run{}, err
	}
	stem := started.Format("20060102-150405") + "-" + plain(name)
	id := stem
	for n := 2; n < 1000; n++ {
		err := os.Mkdir(filepath.Join(s.root, id), 0o755)
		if err == nil {
			return s.run(id), nil
		}
		if !errors.Is(err, os.ErrExist) {
			return Run{}, err
		}
		id = fmt.Sprintf("%s-%d", stem, n)
	}
	return Run{}, fmt.Errorf("%s: a thousand runs began in one second", s.root)
}

// plain keeps letters and digits of ASCII of a name, at most 24.
func plain(name string) string {
	keep := func(r rune) rune {
		switch {
		case r >= 'a' && r <= 'z', r >= 'A' && r <= 'Z', r >= '0' && r <= '9', r == '_':
			return r
		}
		return -1
	}
	short := strings.Map(keep, name)
	if short == "" {
		return "run"
	}
	return short[:min(len(short), 24)]
}

func (s Store) run(id string) Run {
	return Run{ID: id, Folder: filepath.Join(s.root, id), pending: s.pending}
}

// Find returns the run with that identifier, or the only one that begins so.
func (s Store) Find(id string) (Run, error) {
	ids, err := s.ids()
	if err != nil {
		return Run{}, err
	}
	var found []string
	for _, have := range ids {
		if have == id {
			return s.run(have), nil
		}
		if id != "" && strings.HasPrefix(have, id) {
			found = append(found, have)
		}
	}
	switch len(found) {
	case 1:
		return s.run(found[0]), nil
	case 0:
		return Run{}, fmt.Errorf("no run is called %q; \"rowstead runs\" lists them", id)
	}
	return Run{}, fmt.Errorf("%q is the beginning of %d runs; give more of the name: %s", id, len(found), listed(found))
}

// listed names up to ten runs, the newest.
func listed(ids []string) string {
	const most = 10
	if len(ids) <= most {
		return strings.Join(ids, ", ")
	}
	return strings.Join(ids[len(ids)-most:], ", ") + " and older ones"
}

// ids lists the folders of runs, oldest first.
func (s Store) ids() ([]string, error) {
	entries, err := os.ReadDir(s.root)
	if errors.Is(err, os.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	var ids []string
	for _, e := range entries {
		if e.IsDir() && !strings.HasPrefix(e.Name(), ".") {
			ids = append(ids, e.Name())
		}
	}
	sort.Strings(ids)
	return ids, nil
}

// List returns the records of all runs, oldest first. A folder without a
// readable record is returned with an Error that says so.
func (s Store) List() ([]*report.Record, error) {
	ids, err := s.ids()
	if err != nil {
		return nil, err
	}
	all := make([]*report.Record, len(ids))
	for i, id := range ids {
		if all[i], err = s.run(id).Load(); err != nil {
			all[i] = report.New("")
			all[i].ID, all[i].Error = id, err.Error()
		}
	}
	return all, nil
}

// RecordPath is where the record is.
func (r Run) RecordPath() string { return filepath.Join(r.Folder, recordFile) }

// Save replaces the record.
func (r Run) Save(record *report.Record) error {
	return r.pending.Write(r.RecordPath(), true, func(w io.Writer) error {
		_, err := w.Write(record.Encode())
		return err
	})
}

// Load reads the record.
func (r Run) Load() (*report.Record, error) {
	text, err := os.ReadFile(r.RecordPath())
	if errors.Is(err, os.ErrNotExist) {
		return nil, fmt.Errorf("run %s has no record: it ended before it began", r.ID)
	}
	if err != nil {
		return nil, err
	}
	record := report.New("")
	if err := json.Unmarshal(text, record); err != nil {
		return nil, fmt.Errorf("%s: not a record: %w", r.RecordPath(), err)
	}
	if record.Format > report.Format {
		return nil, fmt.Errorf("%s: written by a newer rowstead (format %d, this one reads %d)", r.RecordPath(), record.Format, report.Format)
	}
	r.settle(record)
	return record, nil
}
