package replace

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"testing"
)

// only returns the names in a folder.
func only(t *testing.T, folder string) []string {
	t.Helper()
	entries, err := os.ReadDir(folder)
	if err != nil {
		t.Fatal(err)
	}
	names := []string{}
	for _, e := range entries {
		names = append(names, e.Name())
	}
	return names
}

func say(text string) func(io.Writer) error {
	return func(w io.Writer) error {
		_, err := io.WriteString(w, text)
		return err
	}
}

func TestWrite(t *testing.T) {
	folder := t.TempDir()
	path := filepath.Join(folder, "x.mtx")
	var p Pending
	if err := p.Write(path, false, say("one")); err != nil {
		t.Fatal(err)
	}
	if err := p.Write(path, false, say("two")); !errors.Is(err, os.ErrExist) {
		t.Errorf("an existing file: got %v, want %v", err, os.ErrExist)
	}
	broken := errors.New("broken")
	if err := p.Write(path, true, func(w io.Writer) error { io.WriteString(w, "half"); return broken }); !errors.Is(err, broken) {
		t.Errorf("a failing writer: got %v", err)
	}
	if text, _ := os.ReadFile(path); string(text) != "one" {
		t.Errorf("the old file holds %q", text)
	}
	if err := p.Write(path, true, say("two")); err != nil {
		t.Error(err)
	}
	if text, _ := os.ReadFile(path); string(text) != "two" {
		t.Errorf("after overwriting: %q", text)
	}
	if names := only(t, folder); len(names) != 1 {
		t.Errorf("left over: %v", names)
	}
}

// After Abandon nothing half-written stays and nothing new begins.
func TestAbandon(t *testing.T) {
	folder := t.TempDir()
	var p Pending
	err := p.Write(filepath.Join(folder, "x.mtx"), false, func(w io.Writer) error {
		p.Abandon()
		return nil
	})
	if err == nil {
		t.Error("a file took its name after Abandon")
	}
	if err := p.Write(filepath.Join(folder, "y.mtx"), false, say("y")); err == nil {
		t.Error("a new file after Abandon")
	}
	if names := only(t, folder); len(names) != 0 {
		t.Errorf("left over: %v", names)
	}
}

func TestProbe(t *testing.T) {
	folder := t.TempDir()
	if err := Probe(filepath.Join(folder, "x.mtx")); err != nil {
		t.Error(err)
	}
	if err := Probe(filepath.Join(folder, "none", "x.mtx")); err == nil {
		t.Error("a folder that is not there")
	}
	if names := only(t, folder); len(names) != 0 {
		t.Errorf("left over: %v", names)
	}
}
