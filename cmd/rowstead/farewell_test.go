package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"rowstead/cmd/internal/records"
)

// Ending at once says what was written and which run is broken off.
func TestFarewell(t *testing.T) {
	t.Setenv(records.HomeVariable, t.TempDir())
	a := newApp(nil, new(bytes.Buffer), new(bytes.Buffer))
	store, err := records.Open(&a.pending)
	if err != nil {
		t.Fatal(err)
	}
	run, err := store.Create(time.Now(), "dam")
	if err != nil {
		t.Fatal(err)
	}
	say := func(want string, not ...string) {
		t.Helper()
		got, _ := a.farewell()
		if !strings.Contains(got, want) {
			t.Errorf("%q is not in %q", want, got)
		}
		for _, text := range not {
			if strings.Contains(got, text) {
				t.Errorf("%q is in %q", text, got)
			}
		}
	}
	for _, task := range []string{"audit", "sample", ""} {
		a.task = task
		say("interrupted; nothing was written", "run ")
	}
	a.written = []string{"dam.mtx"}
	say("written so far: dam.mtx")
	a.written, a.task = nil, "solve"
	say("before there was an answer", "resume")
	a.current = run
	say("run "+run.ID+" is broken off", "resume")
	if err := os.WriteFile(filepath.Join(run.Folder, "snapshot"), nil, 0o644); err != nil {
		t.Fatal(err)
	}
	say("carry on with rowstead resume " + run.ID)
}
