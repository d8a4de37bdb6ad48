package matfile

import (
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rowstead/partition/csr"
)

func randomDense(rows, cols int, isComplex bool) *Dense {
	rng := rand.New(rand.NewPCG(uint64(rows), uint64(cols)))
	d := &Dense{Rows: rows, Cols: cols, Complex: isComplex}
	for len(d.Values) < rows*cols {
		v := math.Float64frombits(rng.Uint64())
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			d.Values = append(d.Values, v)
		}
	}
	d.Values[0] = math.Copysign(0, -1)
	return d
}

func TestVectorsComeBackToTheLastBit(t *testing.T) {
	for _, name := range []string{"x.mtx", "x.mtx.gz", "x.mtx.zst", "x.txt", "x.npy", "x.NPY.gz", "x.npy.zst"} {
		for _, d := range []*Dense{randomDense(100, 1, false), randomDense(50, 3, false), randomDense(60, 2, true)} {
			path := filepath.Join(t.TempDir(), name)
			if err := WriteDense(path, d, WriteOptions{Comment: []string{"two\nlines"}}); err != nil {
				t.Fatal(err)
			}
			got, h, err := ReadDense(path, Options{})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(bitsOf(d), bitsOf(got)); diff != "" || got.Rows != d.Rows || got.Complex != d.Complex {
				t.Errorf("%s, %+v: want −, got +:\n%s", name, h, diff)
			}
		}
	}
}

func bitsOf(d *Dense) []uint64 {
	out := make([]uint64, len(d.Values))
	for k, v := range d.Values {
		out[k] = math.Float64bits(v)
	}
	return out
}

func TestMatrixComesBackToTheLastBit(t *testing.T) {
	var entries csr.Triplets
	d := randomDense(300, 1, false)
	for k, v := range d.Values {
		entries.Add(k*7%50, k*k%60, v/1e10)
	}
	m := entries.Matrix(50, 60)
	for _, name := range []string{"a.mtx", "a.mtx.gz", "a.mtx.zst"} {
		path := filepath.Join(t.TempDir(), name)
		if err := WriteMatrix(path, m, WriteOptions{}); err != nil {
			t.Fatal(err)
		}
		got, _, err := ReadMatrix(path, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(m, got); diff != "" {
			t.Errorf("%s: want −, got +:\n%s", name, diff)
		}
	}
}

func TestExistingFileIsKept(t *testing.T) {
	path := write(t, "x.mtx", "precious")
	d := &Dense{Rows: 1, Cols: 1, Values: []float64{1}}
	if err := WriteDense(path, d, WriteOptions{}); !errors.Is(err, ErrExists) {
		t.Errorf("error is %v, want ErrExists", err)
	}
	if text, _ := os.ReadFile(path); string(text) != "precious" {
		t.Errorf("the file is now %q", text)
	}
	if err := WriteDense(path, d, WriteOptions{Overwrite: true}); err != nil {
		t.Error(err)
	}
	if got, _, err := ReadDense(path, Options{}); err != nil || got.Values[0] != 1 {
		t.Errorf("after overwriting: %v, %v", got, err)
	}
}

func TestMatrixStream(t *testing.T) {
	h := Header{Rows: 3, Cols: 3, Stored: 3, Symmetry: "symmetric"}
	path := filepath.Join(t.TempDir(), "a.mtx")
	good := func(put func(i, j int, v float64) error) error {
		return errors.Join(put(0, 0, 1), put(2, 1, 1.0/3), put(2, 2, 5))
	}
	if err := WriteMatrixStream(path, h, WriteOptions{Comment: []string{"made here"}}, good); err != nil {
		t.Fatal(err)
	}
	m, got, err := ReadMatrix(path, Options{})
	if err != nil || m.At(1, 2) != 1.0/3 || m.At(2, 1) != 1.0/3 || m.Entries() != 4 || got.Symmetry != "symmetric" || got.Title != "made here" {
		t.Errorf("%+v, %v, %v", got, m, err)
	}
	for name, fill := range map[string]func(put func(i, j int, v float64) error) error{
		"too few":        func(put func(i, j int, v float64) error) error { return put(0, 0, 1) },
		"too many":       func(put func(i, j int, v float64) error) error { return errors.Join(good(put), put(1, 1, 1)) },
		"outside":        func(put func(i, j int, v float64) error) error { return put(3, 0, 1) },
		"upper triangle": func(put func(i, j int, v float64) error) error { return put(0, 1, 1) },
		"not finite":     func(put func(i, j int, v float64) error) error { return put(0, 0, math.NaN()) },
		"own error":      func(func(i, j int, v float64) error) error { return os.ErrClosed },
	} {
		path := filepath.Join(t.TempDir(), "a.mtx")
		if err := WriteMatrixStream(path, h, WriteOptions{}, fill); err == nil {
			t.Errorf("%s: no error", name)
		}
		if left, _ := os.ReadDir(filepath.Dir(path)); len(left) != 0 {
			t.Errorf("%s: %v is left", name, left)
		}
	}
}

func TestVectorsThatAreNotFiniteAreRefused(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x.mtx")
	if err := WriteDense(path, &Dense{Rows: 2, Cols: 1, Values: []float64{1, math.Inf(1)}}, WriteOptions{}); err == nil {
		t.Error("no error")
	}
	if _, err := os.Stat(path); err == nil {
		t.Error("a file is there")
	}
}

func TestHashIsThatOfTheBytes(t *testing.T) {
	// SHA-256 of "abc": FIPS 180-4, example in its annex.
	const want = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
	if got, err := Hash(write(t, "a", "abc")); err != nil || got != want {
		t.Errorf("Hash = %s, %v, want %s", got, err, want)
	}
}

func TestInterleaved(t *testing.T) {
	d := &Dense{Rows: 2, Cols: 2, Values: []float64{1, 2, 3, 4}}
	want := &Dense{Rows: 4, Cols: 2, Complex: true, Values: []float64{1, 0, 2, 0, 3, 0, 4, 0}}
	if diff := cmp.Diff(want, d.Interleaved()); diff != "" {
		t.Errorf("want −, got +:\n%s", diff)
	}
	if want.Interleaved() != want {
		t.Error("a complex one is copied")
	}
}
