package records

import (
	"strings"
	"testing"
	"time"

	"rowstead/cmd/internal/replace"
	"rowstead/coordinator/report"
)

// A run is what its record says while somebody holds it, and broken off as soon
// as nobody does; one that has ended stays as it ended.
func TestBrokenOff(t *testing.T) {
	t.Setenv(HomeVariable, t.TempDir())
	store, err := Open(new(replace.Pending))
	if err != nil {
		t.Fatal(err)
	}
	run, err := store.Create(time.Now(), "dam")
	if err != nil {
		t.Fatal(err)
	}
	record := report.New("solve")
	record.ID, record.State = run.ID, report.Stepping
	load := func(state, advice string) {
		t.Helper()
		if err := run.Save(record); err != nil {
			t.Fatal(err)
		}
		got, err := run.Load()
		if err != nil || got.State != state || !strings.Contains(got.Advice, advice) {
			t.Fatalf("state %q, advice %q, %v; want %q, %q", got.State, got.Advice, err, state, advice)
		}
	}
	load(report.BrokenOff, "anew")
	held, err := run.Hold()
	if err != nil {
		t.Fatal(err)
	}
	if !run.Alive() {
		t.Error("held and not alive")
	}
	load(report.Stepping, "")
	if _, err := run.Hold(); err == nil {
		t.Error("held twice")
	}
	if err := held.Close(); err != nil {
		t.Fatal(err)
	}
	if err := run.SaveSnapshot(Snapshot{X: [][]float64{{1}}}); err != nil {
		t.Fatal(err)
	}
	load(report.BrokenOff, "rowstead resume "+run.ID)
	record.State = report.Finished
	load(report.Finished, "")
}
