package snapshot

import (
	"bytes"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

func sample(rows, directions int) State {
	s := State{Run: "run 7", FirstRow: 24, X: make([]float64, rows)}
	for i := range s.Matrix {
		s.Matrix[i] = byte(i)
	}
	for i := range s.X {
		s.X[i] = math.Sqrt(float64(i)) * 1e-300
	}
	for d := range directions {
		z := make([]float64, rows)
		for i := range z {
			z[i] = float64(i - d)
		}
		s.Z = append(s.Z, z)
	}
	return s
}

func TestSaveThenLoad(t *testing.T) {
	for name, s := range map[string]State{
		"x alone":         sample(1000, 0),
		"with directions": sample(9001, 3),
		"no rows":         sample(0, 2),
		"not a number":    {X: []float64{math.Inf(1), math.Copysign(0, -1)}},
	} {
		t.Run(name, func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "x.snap")
			for range 2 { // the second time over the first
				if err := Save(path, s); err != nil {
					t.Fatal(err)
				}
			}
			got, err := Load(path)
			if err != nil {
				t.Fatal(err)
			}
			if d := cmp.Diff(s, got, cmpopts.EquateEmpty()); d != "" {
				t.Errorf("Load after Save (-want +got):\n%s", d)
			}
		})
	}
}

// Whatever single byte is altered, and wherever the file is cut, Load refuses.
func TestLoadRefusesDamage(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x.snap")
	if err := Save(path, sample(5, 1)); err != nil {
		t.Fatal(err)
	}
	whole, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	for i := range whole {
		bad := bytes.Clone(whole)
		bad[i] ^= 0x10
		if _, err := read(bytes.NewReader(bad), int64(len(bad))); err == nil {
			t.Errorf("byte %d altered: no error", i)
		}
		if _, err := read(bytes.NewReader(whole[:i]), int64(i)); !errors.Is(err, ErrDamaged) {
			t.Errorf("cut after %d bytes: %v", i, err)
		}
	}
	longer := append(bytes.Clone(whole), 0)
	if _, err := read(bytes.NewReader(longer), int64(len(longer))); !errors.Is(err, ErrDamaged) {
		t.Errorf("one byte more: %v", err)
	}
}

func TestFailuresLeaveTheOldFile(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "x.snap")
	if err := Save(path, sample(5, 0)); err != nil {
		t.Fatal(err)
	}
	before, _ := os.ReadFile(path)
	full := errors.New("disk full")
	err := replace(path, func(w io.Writer) error {
		if _, err := w.Write([]byte("half")); err != nil {
			return err
		}
		return full
	})
	if !errors.Is(err, full) {
		t.Errorf("replace = %v, want the writer's error", err)
	}
	bad := sample(5, 1)
	bad.Z[0] = bad.Z[0][:4]
	if err := Save(path, bad); err == nil {
		t.Error("Save of vectors of different lengths: no error")
	}
	if err := Save(filepath.Join(dir, "none", "x"), sample(1, 0)); err == nil {
		t.Error("Save into a folder that is not there: no error")
	}
	after, _ := os.ReadFile(path)
	entries, _ := os.ReadDir(dir)
	if !bytes.Equal(before, after) || len(entries) != 1 {
		t.Errorf("the old file changed or %d files are left", len(entries))
	}
}

func TestLoadNamesTheFile(t *testing.T) {
	path := filepath.Join(t.TempDir(), "other")
	if err := os.WriteFile(path, []byte(strings.Repeat("text ", 40)), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Load(path); err == nil || !strings.Contains(err.Error(), path) {
		t.Errorf("Load = %v, want an error that names %s", err, path)
	}
}

func FuzzRead(f *testing.F) {
	path := filepath.Join(f.TempDir(), "x.snap")
	if err := Save(path, sample(3, 1)); err != nil {
		f.Fatal(err)
	}
	whole, _ := os.ReadFile(path)
	f.Add(whole)
	f.Add([]byte(magic))
	f.Fuzz(func(t *testing.T, b []byte) {
		s, err := read(bytes.NewReader(b), int64(len(b)))
		if err == nil && 8*len(s.X)*(1+len(s.Z)) > len(b) {
			t.Errorf("more numbers than bytes")
		}
	})
}
