package records

import (
	"bytes"
	"errors"
	"os"
	"path/filepath"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"rowstead/cmd/internal/replace"
	"rowstead/coordinator/report"
)

func open(t *testing.T) Store {
	t.Helper()
	t.Setenv(HomeVariable, t.TempDir())
	s, err := Open(new(replace.Pending))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

var morning = time.Date(2026, 3, 1, 8, 15, 0, 0, time.UTC)

func TestStore(t *testing.T) {
	s := open(t)
	if all, err := s.List(); err != nil || len(all) != 0 {
		t.Fatalf("an empty store: %v, %v", all, err)
	}
	first, err := s.Create(morning, "dam (new).mtx")
	if err != nil || first.ID != "20260301-081500-damnewmtx" {
		t.Fatalf("got %q, %v", first.ID, err)
	}
	second, err := s.Create(morning, "dam (new).mtx")
	if err != nil || second.ID != first.ID+"-2" {
		t.Fatalf("got %q, %v", second.ID, err)
	}
	record := report.New("solve")
	record.ID = second.ID
	if err := second.Save(record); err != nil {
		t.Fatal(err)
	}
	all, err := s.List()
	if err != nil || len(all) != 2 || all[0].Error == "" || all[1].Job != "solve" {
		t.Errorf("got %v, %v", all, err)
	}
	for id, want := range map[string]string{first.ID: first.ID, second.ID: second.ID, "20260301-081500-damnewmtx-": second.ID, "2026": "", "": "", "x": "", "..": ""} {
		if got, err := s.Find(id); got.ID != want || (err == nil) != (want != "") {
			t.Errorf("Find(%q) = %q, %v, want %q", id, got.ID, err, want)
		}
	}
}

func TestNewerRecord(t *testing.T) {
	s := open(t)
	run, err := s.Create(morning, "dam")
	if err != nil {
		t.Fatal(err)
	}
	record := report.New("solve")
	record.Format = report.Format + 1
	if err := run.Save(record); err != nil {
		t.Fatal(err)
	}
	if _, err := run.Load(); err == nil {
		t.Error("a record of a newer format was read")
	}
}

// A snapshot reads back to the last bit.
func TestSnapshotRoundTrip(t *testing.T) {
	run := Run{ID: "a", Folder: t.TempDir(), pending: new(replace.Pending)}
	rapid.Check(t, func(t *rapid.T) {
		rows, columns := rapid.IntRange(0, 20000).Draw(t, "rows"), rapid.IntRange(1, 3).Draw(t, "columns")
		want := Snapshot{Done: rapid.IntRange(0, columns).Draw(t, "done"), X: make([][]float64, columns)}
		for j := range want.X {
			want.X[j] = make([]float64, rows)
			for i := range want.X[j] {
				want.X[j][i] = 1 / float64(1+i+7*j)
			}
		}
		if err := run.SaveSnapshot(want); err != nil {
			t.Fatal(err)
		}
		got, err := run.LoadSnapshot()
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(want, got); diff != "" {
			t.Fatal(diff)
		}
	})
}

// Any changed or missing byte of a snapshot is noticed.
func TestSnapshotDamage(t *testing.T) {
	run := Run{ID: "a", Folder: t.TempDir(), pending: new(replace.Pending)}
	if _, err := run.LoadSnapshot(); !errors.Is(err, ErrNoSnapshot) {
		t.Errorf("got %v, want %v", err, ErrNoSnapshot)
	}
	if err := run.SaveSnapshot(Snapshot{X: [][]float64{{1, 2, 3}}}); err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(run.Folder, snapshotFile)
	good, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	for i := range good {
		bad := bytes.Clone(good)
		bad[i] ^= 4
		for _, text := range [][]byte{bad, good[:i]} {
			if err := os.WriteFile(path, text, 0o644); err != nil {
				t.Fatal(err)
			}
			if s, err := run.LoadSnapshot(); err == nil {
				t.Errorf("byte %d: read %v", i, s)
			}
		}
	}
}
