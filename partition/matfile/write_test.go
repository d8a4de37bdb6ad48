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
	for _, name := range []string{"x.mtx", "x.mtx.gz", "x.mtx.zst", "x.txt"} {
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
