package coordinator

import (
	"errors"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"rowstead/coordinator/method"
)

// Whatever is chosen fits what is allowed, and what was asked for is kept.
func TestFitKeepsItsWord(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := size{
			rows: float64(rapid.IntRange(1, 1e8).Draw(t, "rows")), columns: 1, recycle: recycled,
			precondition: rapid.SampledFrom([]string{"auto", "none", "diagonal", "ilu0", "ilut"}).Draw(t, "precondition"),
		}
		s.entries = s.rows * rapid.Float64Range(1, 30).Draw(t, "entries a row")
		j := Job{
			Basis: rapid.SampledFrom([]string{"auto", "double", "single", "replay"}).Draw(t, "basis"),
			Cycle: rapid.SampledFrom([]int{0, 1, 50, 2000}).Draw(t, "cycle"),
		}
		allowed := rapid.Float64Range(1, 1e13).Draw(t, "allowed")
		f, _, err := s.fit(j, allowed)
		var fit *FitError
		switch {
		case errors.As(err, &fit):
			if fit.Need <= allowed || !strings.Contains(err.Error(), "are missing") {
				t.Fatalf("refused %v of %v: %v", fit.Need, allowed, err)
			}
			return
		case s.total(f) > allowed:
			t.Fatalf("%+v takes %v of %v", f, s.total(f), allowed)
		}
		if !automatic(j.Basis) && f.basis != method.BasisForm(j.Basis) || j.Cycle > 0 && f.cycle != j.Cycle {
			t.Fatalf("%+v was chosen for %+v", f, j)
		}
	})
}

// Where nothing with a basis fits, a matrix that is declared symmetric is left to
// conjugate gradients; a general one is refused.
func TestFitWithoutBasis(t *testing.T) {
	folder := t.TempDir()
	for _, symmetry := range []string{"symmetric", "general"} {
		path := filepath.Join(folder, symmetry+".mtx")
		if err := os.WriteFile(path, []byte("%%MatrixMarket matrix coordinate real "+symmetry+"\n1 1 1\n1 1 2\n"), 0o644); err != nil {
			t.Fatal(err)
		}
		s := size{rows: 1e6, entries: 7e6, columns: 1, recycle: recycled, precondition: "ilu0"}
		without := s
		without.method = method.CG
		_, _, err := s.fit(Job{Matrix: path}, without.total(form{})*1.01)
		switch {
		case symmetry == "symmetric" && (err != nil || s.method != method.CG):
			t.Errorf("refused: %v, method %q", err, s.method)
		case symmetry == "general" && err == nil:
			t.Errorf("%+v fits", s)
		}
		if symmetry == "symmetric" {
			s.method = ""
			if _, _, err := s.fit(Job{Matrix: path}, 1e6); err == nil || strings.Contains(err.Error(), "basis") {
				t.Errorf("the refusal names what is not needed: %v", err)
			}
		}
	}
}

// More memory never gives a shorter cycle in the same form.
func TestFitInSteps(t *testing.T) {
	s := size{rows: 1e6, entries: 7e6, columns: 1, recycle: recycled, precondition: "ilu0"}
	for _, c := range []struct {
		allowed float64
		want    form
	}{
		{1e11, form{method.Double, longestCycle}},
		{4e9, form{method.Double, usualCycle}},
		{2.5e9, form{method.Single, usualCycle}},
		{1.7e9, form{method.Single, 200}},
		{0.8e9, form{method.Replay, usualCycle}},
	} {
		got, why, err := s.fit(Job{}, c.allowed)
		if err != nil || got != c.want {
			t.Errorf("with %.1e bytes: %+v, %v, want %+v", c.allowed, got, err, c.want)
		}
		usual := c.want.basis == method.Double && c.want.cycle >= usualCycle
		if usual != (why == "") {
			t.Errorf("with %.1e bytes the reason is %q", c.allowed, why)
		}
	}
}

func TestShortName(t *testing.T) {
	for path, want := range map[string]string{
		"x.mtx": "x.short.mtx", "a/b.c/x": "a/b.c/x.short", "x.mtx.gz": "x.short.mtx.gz", "x.npy": "x.short.npy", "v1.2.mtx": "v1.2.short.mtx",
	} {
		if got := ShortName(path); got != want {
			t.Errorf("ShortName(%q) = %q, want %q", path, got, want)
		}
	}
}

func TestBytesText(t *testing.T) {
	for _, c := range []struct {
		bytes float64
		want  string
	}{{0, "0 bytes"}, {999, "999 bytes"}, {1000, "1.00 kB"}, {15.6e9, "15.6 GB"}, {156e9, "156 GB"}, {1e18, "1000 PB"}} {
		if got := bytesText(c.bytes); got != c.want {
			t.Errorf("bytesText(%v) = %q, want %q", c.bytes, got, c.want)
		}
	}
	if strings.Contains(bytesText(math.MaxFloat64), "%!") {
		t.Error("a format fault")
	}
}
