package csr_test

import (
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// drawn is a random matrix with its entries, equal positions among them.
func drawn(t *rapid.T) (*csr.Matrix, *csr.Triplets, int, int) {
	rows, cols := rapid.IntRange(0, 12).Draw(t, "rows"), rapid.IntRange(1, 12).Draw(t, "cols")
	entries := &csr.Triplets{}
	if rows > 0 {
		for range rapid.IntRange(0, 60).Draw(t, "entries") {
			entries.Add(rapid.IntRange(0, rows-1).Draw(t, "i"), rapid.IntRange(0, cols-1).Draw(t, "j"), rapid.Float64Range(-1, 1).Draw(t, "v"))
		}
	}
	return entries.Matrix(rows, cols), entries, rows, cols
}

// Triplets give the matrix whose every position is the sum of its entries in
// the order in which they stand, to the last bit.
func TestTripletsSumInOrder(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, entries, rows, cols := drawn(t)
		if err := m.Check(); err != nil {
			t.Fatal(err)
		}
		want := make([]float64, rows*cols)
		for k, v := range entries.V {
			want[int(entries.I[k])*cols+int(entries.J[k])] += v
		}
		for i := range rows {
			for j := range cols {
				if got := m.At(i, j); got != want[i*cols+j] {
					t.Fatalf("At(%d, %d) = %v, want %v", i, j, got, want[i*cols+j])
				}
			}
		}
	})
}

// The transpose of the transpose is the matrix, and MulT is the product with it.
func TestTranspose(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, _, rows, cols := drawn(t)
		tr := m.Transpose()
		if err := tr.Check(); err != nil {
			t.Fatal(err)
		}
		if d := cmp.Diff(m, tr.Transpose()); d != "" {
			t.Fatalf("transposed twice (-want +got):\n%s", d)
		}
		x := rapid.SliceOfN(rapid.Float64Range(-1, 1), rows, rows).Draw(t, "x")
		got, want := make([]float64, cols), make([]float64, cols)
		m.MulT(got, x)
		tr.Mul(want, x)
		for j := range want {
			// Both sum the same products in the same order, zeros aside.
			if math.Abs(got[j]-want[j]) > 1e-15*float64(rows+1) {
				t.Fatalf("MulT[%d] = %v, the transpose gives %v", j, got[j], want[j])
			}
		}
	})
}

func TestCheckNamesTheFault(t *testing.T) {
	good := func() *csr.Matrix {
		return &csr.Matrix{Rows: 2, Cols: 3, Start: []int{0, 2, 3}, Col: []int32{0, 2, 1}, Val: []float64{1, 2, 3}}
	}
	if err := good().Check(); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name  string
		spoil func(m *csr.Matrix)
		want  string
	}{
		{"too few starts", func(m *csr.Matrix) { m.Start = m.Start[:2] }, "2 row starts"},
		{"starts beyond the entries", func(m *csr.Matrix) { m.Start[2] = 4 }, "row starts end at 4"},
		{"starts that fall", func(m *csr.Matrix) { m.Start[1] = 4 }, "row 0 starts at 0 and ends at 4"},
		{"columns that do not ascend", func(m *csr.Matrix) { m.Col[1] = 0 }, "row 0 has column 0 after 0"},
		{"a column outside", func(m *csr.Matrix) { m.Col[2] = 3 }, "row 1 has column 3"},
		{"a negative column", func(m *csr.Matrix) { m.Col[2] = -1 }, "row 1 has column -1"},
		{"not a number", func(m *csr.Matrix) { m.Val[2] = math.NaN() }, "row 1, column 1"},
		{"infinity", func(m *csr.Matrix) { m.Val[0] = math.Inf(1) }, "row 0, column 0"},
	} {
		m := good()
		c.spoil(m)
		if err := m.Check(); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want it to say %q", c.name, err, c.want)
		}
	}
}
