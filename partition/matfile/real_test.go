package matfile

import (
	"bytes"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

const realMatrices = "../../testdata/matrices"

// What SOURCES.md says of every shipped matrix is what is read, and the rows
// assembled are those that package csr assembles from the same entries.
func TestShippedMatrices(t *testing.T) {
	list, err := os.ReadFile(filepath.Join(realMatrices, "SOURCES.md"))
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for line := range strings.Lines(string(list)) {
		cells := strings.Split(line, "|")
		if len(cells) < 6 || !strings.Contains(cells[1], ".mtx") {
			continue
		}
		seen++
		name := strings.TrimSpace(cells[1])
		path := filepath.Join(realMatrices, name)
		m, h, err := ReadMatrix(path, Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		if err := m.Check(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		scale := 1
		if h.Complex {
			scale = 2
		}
		got := []int{m.Rows / scale, m.Cols / scale, m.Entries() / scale / scale}
		want := make([]int, 3)
		for k := range want {
			n, _ := wholeNumber(bytes.TrimSpace([]byte(cells[2+k])))
			want[k] = int(n)
		}
		if diff := cmp.Diff(want, got); diff != "" {
			t.Errorf("%s: rows, columns, entries: want −, got +:\n%s", name, diff)
		}
		if !reflect.DeepEqual(entriesOf(t, path, Options{ChunkSize: 5000}).Matrix(m.Rows, m.Cols), m) {
			t.Errorf("%s: assembled otherwise than csr does", name)
		}
	}
	if seen < 20 {
		t.Errorf("only %d matrices are listed", seen)
	}
}

// x of the file solves A·x = b of the files to the digits that x is given.
func TestShippedVectors(t *testing.T) {
	m, _, err := ReadMatrix(filepath.Join(realMatrices, "utm300.mtx"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	x, _, err := ReadDense(filepath.Join(realMatrices, "utm300_xref.mtx"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	b, _, err := ReadDense(filepath.Join(realMatrices, "utm300_rhs.mtx"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	ax := make([]float64, m.Rows)
	m.Mul(ax, x.Values)
	for i := range ax {
		cols, vals := m.Row(i)
		size := 0.0
		for k, c := range cols {
			size += math.Abs(vals[k] * x.Values[c])
		}
		// x correctly rounded, then a sum of len(cols) products: Higham, Accuracy
		// and Stability of Numerical Algorithms, section 3.1.
		if bound := float64(len(cols)+2) * 0x1p-53 * size; math.Abs(ax[i]-b.Values[i]) > bound {
			t.Errorf("row %d: b − A·x is %g, rounding allows %g", i+1, b.Values[i]-ax[i], bound)
		}
	}
}
