package order

import (
	"math"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// wild draws any finite number, of any size.
func wild() *rapid.Generator[float64] {
	return rapid.Custom(func(t *rapid.T) float64 {
		return math.Ldexp(rapid.Float64Range(-1, 1).Draw(t, "fraction"), rapid.IntRange(-1074, 1023).Draw(t, "exponent"))
	})
}

// The largest entry of a scaled row lies in [1, 2), a row without a nonzero
// keeps exponent 0, and what was scaled exactly comes back.
func TestRowScale(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 12).Draw(t, "rows")
		var entries csr.Triplets
		for range rapid.IntRange(0, 40).Draw(t, "entries") {
			entries.Add(rapid.IntRange(0, n-1).Draw(t, "i"), rapid.IntRange(0, n-1).Draw(t, "j"), wild().Draw(t, "v"))
		}
		m := entries.Matrix(n, n)
		if m.Check() != nil {
			t.Skip("duplicates overflowed")
		}
		e := RowScale(m)
		scaled, lost := ScaleRows(m, e)
		was, is := RowMax(m), RowMax(scaled)
		for i := range e {
			if (was[i] == 0 && (e[i] != 0 || is[i] != 0)) || (was[i] != 0 && !(is[i] >= 1 && is[i] < 2)) {
				t.Fatalf("row %d: largest %v, exponent %d, then %v", i, was[i], e[i], is[i])
			}
			e[i] = -e[i]
		}
		back, _ := ScaleRows(scaled, e)
		moved := 0
		for k := range m.Val {
			if back.Val[k] != m.Val[k] {
				moved++
			}
		}
		if moved != lost {
			t.Fatalf("%d entries are not exact, reported %d", moved, lost)
		}
	})
}

func TestRowScaleAtTheEnds(t *testing.T) {
	cases := []struct {
		name string
		v    float64
		want int16
	}{
		{"one", 1, 0},
		{"just below two", math.Nextafter(2, 0), 0},
		{"minus two", -2, -1},
		{"zero", 0, 0},
		{"largest", math.MaxFloat64, -1023},
		{"smallest normal", 0x1p-1022, 1022},
		{"smallest", 0x1p-1074, 1074},
	}
	for _, c := range cases {
		m := &csr.Matrix{Rows: 1, Cols: 1, Start: []int{0, 1}, Col: []int32{0}, Val: []float64{c.v}}
		if got := RowScale(m)[0]; got != c.want {
			t.Errorf("%s: RowScale of %v = %d, want %d", c.name, c.v, got, c.want)
		}
	}
}

// S·A·S of a symmetric matrix is symmetric, and its diagonal lies in [½, 2).
func TestSymmetricScale(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 10).Draw(t, "rows")
		var entries csr.Triplets
		for i := range n {
			entries.Add(i, i, wild().Draw(t, "diagonal"))
			if j := rapid.IntRange(0, n-1).Draw(t, "j"); j < i {
				v := rapid.Float64Range(-1e9, 1e9).Draw(t, "v")
				entries.Add(i, j, v)
				entries.Add(j, i, v)
			}
		}
		m := entries.Matrix(n, n)
		e := SymmetricScale(m)
		scaled, lost := ScaleSymmetric(m, e)
		for i := range n {
			was, is := m.At(i, i), math.Abs(scaled.At(i, i))
			if (was == 0 && e[i] != 0) || (was != 0 && !(is >= 0.5 && is < 2)) {
				t.Fatalf("diagonal %d: %v, exponent %d, then %v", i, was, e[i], is)
			}
		}
		if lost == 0 && !SymmetryOf(scaled).Exact {
			t.Fatal("S·A·S is not symmetric")
		}
	})
}

func TestScaleVectorReportsWhatItLost(t *testing.T) {
	x := []float64{3, 1, 1e300, 0x1p-1074, 0}
	e := []int16{-1, 1074, 100, -1, 1074}
	y := make([]float64, len(x))
	if lost := ScaleVector(y, x, e); lost != 3 {
		t.Errorf("lost %d of %v, want 3", lost, y)
	}
	if diff := cmp.Diff([]float64{1.5, math.Inf(1), math.Inf(1), 0, 0}, y); diff != "" {
		t.Errorf("−want +got:\n%s", diff)
	}
}

func TestSymmetryOf(t *testing.T) {
	matrix := func(v ...float64) *csr.Matrix {
		var entries csr.Triplets
		for k, w := range v {
			if !math.IsNaN(w) {
				entries.Add(k/3, k%3, w)
			}
		}
		return entries.Matrix(3, 3)
	}
	none := math.NaN()
	cases := []struct {
		name string
		m    *csr.Matrix
		want Symmetry
	}{
		{"symmetric", matrix(4, 1, none, 1, 4, 2, none, 2, 4), Symmetry{Pattern: true, Exact: true, Rounded: true, Row: -1, Column: -1}},
		{"rounded", matrix(4, 1, none, 1+0x1p-52, 4, 2, none, 2, 4), Symmetry{Pattern: true, Rounded: true, Gap: 0x1p-54, Row: 0, Column: 1}},
		{"other values", matrix(4, 1, none, -1, 4, 2, none, 2, 4), Symmetry{Pattern: true, Gap: 0.5, Row: 0, Column: 1}},
		{"a partner is missing", matrix(4, none, none, none, 4, none, 2, none, 4), Symmetry{Gap: 0.5, Row: 2, Column: 0}},
		{"a missing partner of zero", matrix(4, none, none, none, 4, none, 0, none, 4), Symmetry{Exact: true, Rounded: true, Row: -1, Column: -1}},
		{"huge values", matrix(1e308, -1e308, none, 1e308, 1e308, none, none, none, 1), Symmetry{Pattern: true, Gap: 2, Row: 0, Column: 1}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			if diff := cmp.Diff(c.want, SymmetryOf(c.m)); diff != "" {
				t.Errorf("−want +got:\n%s", diff)
			}
		})
	}
}

// A matrix is as symmetric as its dense picture.
func TestSymmetryTwin(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := drawSquare(t)
		got := SymmetryOf(m)
		if got.Pattern != symmetricPattern(m) {
			t.Fatalf("pattern %v, and %v in the search", got.Pattern, !got.Pattern)
		}
		pattern, exact := true, true
		tr := m.Transpose()
		for i := range m.Rows {
			a, _ := m.Row(i)
			b, _ := tr.Row(i)
			pattern = pattern && cmp.Equal(append([]int32{}, a...), append([]int32{}, b...))
			for j := range m.Rows {
				exact = exact && m.At(i, j) == m.At(j, i)
			}
		}
		if got.Pattern != pattern || got.Exact != exact {
			t.Fatalf("SymmetryOf = %+v, want pattern %v, exact %v", got, pattern, exact)
		}
	})
}

func TestStructureAndDiagonal(t *testing.T) {
	// row 0 fine, 1 empty, 2 stored zeros, 3 tiny diagonal, 4 negative and weak;
	// column 1 appears nowhere, column 2 only with zeros
	var entries csr.Triplets
	for _, v := range []struct {
		i, j int
		v    float64
	}{{0, 0, 2}, {0, 3, 2}, {2, 2, 0}, {2, 0, 0}, {3, 3, 1e-9}, {3, 4, 1}, {4, 4, -1}, {4, 0, 3}, {4, 3, 1}} {
		entries.Add(v.i, v.j, v.v)
	}
	m := entries.Matrix(5, 5)
	places := func(at ...int) Places { return Places{Count: len(at), First: at} }
	wantS := Structure{EmptyRows: places(1), ZeroRows: places(2), EmptyColumns: places(1), ZeroColumns: places(2), StoredZeros: 2, LongestRow: 3, LongestAt: 4}
	if diff := cmp.Diff(wantS, StructureOf(m)); diff != "" {
		t.Errorf("StructureOf −want +got:\n%s", diff)
	}
	wantD := Diagonal{Missing: places(1), Zero: places(2), Tiny: places(3), Negative: places(4), Positive: 2, Weak: 2, Smallest: 1e-9}
	if diff := cmp.Diff(wantD, DiagonalReport(m)); diff != "" {
		t.Errorf("DiagonalReport −want +got:\n%s", diff)
	}
	many := StructureOf(&csr.Matrix{Rows: 20, Cols: 20, Start: make([]int, 21)})
	if many.EmptyRows.Count != 20 || len(many.EmptyRows.First) != 8 {
		t.Errorf("twenty empty rows: %+v", many.EmptyRows)
	}
	if d := DiagonalReport(grid(5, 5, 5, 0)); d.Weak != 0 || d.Positive != 125 || d.Smallest != 1 {
		t.Errorf("a 7-point matrix: %+v", d)
	}
}
