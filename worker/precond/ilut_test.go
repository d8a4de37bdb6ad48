package precond

import (
	"cmp"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// plainILUT is ilut on dense rows with nothing clever: the rules of its comment,
// for matrices whose pivots need no replacing. It returns L and D·(I + U),
// row-major, n×n in one.
func plainILUT(a *csr.Matrix, o Options) []float64 {
	n := a.Rows
	f := make([]float64, n*n)
	for i := range n {
		row := f[i*n : (i+1)*n]
		cols, vals := a.Row(i)
		for k, c := range cols {
			row[c] = vals[k]
		}
		floor := o.Drop * meanAbs(vals)
		for c := range i {
			l := row[c] / f[c*n+c]
			if math.Abs(l) < floor && math.Abs(row[c]) < floor {
				row[c] = 0
				continue
			}
			row[c] = l
			for j := c + 1; j < n; j++ {
				row[j] -= l * f[c*n+j]
			}
		}
		cut(row[:i], o.Fill, 0)
		cut(row[i+1:], o.Fill, floor)
	}
	return f
}

// cut zeroes all of v but the fill largest above floor, the first of equal ones.
func cut(v []float64, fill int, floor float64) {
	order := make([]int, len(v))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(math.Abs(v[j]), math.Abs(v[i])) })
	for rank, i := range order {
		if rank >= fill || math.Abs(v[i]) <= floor {
			v[i] = 0
		}
	}
}

// drawDominant draws a small matrix with diagonally dominant rows of different
// sizes; its LU needs no pivoting.
func drawDominant(t *rapid.T) *csr.Matrix {
	a := sparse(rapid.IntRange(1, 80).Draw(t, "rows"), rapid.IntRange(0, 7).Draw(t, "row entries"), 1.2, rapid.Uint64().Draw(t, "seed"))
	for i := range a.Rows {
		_, vals := a.Row(i)
		for k := range vals {
			vals[k] *= float64(i%3) + 0.1
		}
	}
	return a
}

// The worklist and the choice by size give what the plain algorithm gives.
func TestILUTEqualsPlainILUT(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawDominant(t)
		o := Options{Drop: rapid.SampledFrom([]float64{0, 1e-3, 0.05, 0.5}).Draw(t, "drop"), Fill: rapid.IntRange(1, 9).Draw(t, "fill")}
		compare(t, ilut(a, o), plainILUT(a, o), a.Rows)
	})
}

// Without dropping, ILUT is the LU factor, and M⁻¹ the inverse of A.
func TestILUTWithoutDroppingIsLU(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawDominant(t)
		n := a.Rows
		lu := make([]float64, n*n)
		for i := range n {
			cols, vals := a.Row(i)
			for k, c := range cols {
				lu[i*n+int(c)] = vals[k]
			}
		}
		for k := range n { // right-looking elimination without pivoting
			for i := k + 1; i < n; i++ {
				lu[i*n+k] /= lu[k*n+k]
				for j := k + 1; j < n; j++ {
					lu[i*n+j] -= lu[i*n+k] * lu[k*n+j]
				}
			}
		}
		compare(t, ilut(a, Options{Drop: 0, Fill: n}), lu, n)

		p, report := build2(t, ILUT, a, Options{Drop: -1, Fill: n})
		x, b := vector(n, 1), make([]float64, n)
		a.Mul(b, x)
		for i, v := range solved(p, b) {
			if !(math.Abs(v-x[i]) <= 1e-12*(1+norm(x))) {
				t.Fatalf("entry %d of M⁻¹·A·x is %v, want %v", i, v, x[i])
			}
		}
		if report.Kind != ILUT || report.Misfit > 1e-12 {
			t.Fatalf("an exact factor reports %+v", report)
		}
	})
}

// compare checks a factor against dense L and D·(I + U) to rounding.
func compare(t *rapid.T, f ldu, dense []float64, n int) {
	got := make([]float64, n*n)
	for i := range n {
		got[i*n+i] = 1 / f.inverse[i]
		cols, vals := f.lower.Row(i)
		for k, c := range cols {
			got[i*n+int(c)] = vals[k]
		}
		cols, vals = f.upper.Row(i)
		for k, c := range cols {
			got[i*n+int(c)] = vals[k] / f.inverse[i]
		}
	}
	largest := maxAbs(dense)
	for i := range got {
		if !(math.Abs(got[i]-dense[i]) <= 1e-12*largest) {
			t.Fatalf("factor at (%d, %d) is %v, want %v", i/n, i%n, got[i], dense[i])
		}
	}
}

func TestILUTKeepsTheFirstOfEqualEntries(t *testing.T) {
	w, c := newWorkRow(200), chooser{fill: 3}
	w.load([]int32{3, 70, 71, 130, 199}, []float64{2, -2, 5, 2, 2})
	c.take(w, 0, 200, 0)
	if !slices.Equal(c.cols, []int32{3, 70, 71}) || !slices.Equal(c.vals, []float64{2, -2, 5}) {
		t.Errorf("kept %v at %v, want 2 −2 5 at 3 70 71", c.vals, c.cols)
	}
	c.take(w, 71, 199, 2)
	if !slices.Equal(c.cols, []int32{71}) {
		t.Errorf("above 2 in [71, 199): %v, want column 71", c.cols)
	}
}

// A work row finds its columns in ascending order, also those added behind the
// reading position, and is empty after clear.
func TestWorkRowReadsAscending(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.SampledFrom([]int{1, 63, 64, 65, 4096, 4097, 20_000}).Draw(t, "columns")
		column := rapid.IntRange(0, n-1)
		want := map[int]bool{}
		w := newWorkRow(n)
		for _, c := range rapid.SliceOfN(column, 1, 30).Draw(t, "first") {
			w.load([]int32{int32(c)}, []float64{1})
			want[c] = true
		}
		last := -1
		for c := w.next(0); c < n; c = w.next(c + 1) {
			if c <= last || !want[c] {
				t.Fatalf("column %d after %d", c, last)
			}
			last = c
			delete(want, c)
			if more := column.Draw(t, "more"); more > c && w.val[more] == 0 {
				w.subtract(2, []int32{int32(more)}, []float64{3})
				want[more] = true
			}
		}
		w.clear()
		if len(want) > 0 || w.next(0) != n || maxAbs(w.val) != 0 {
			t.Fatalf("columns %v not read; after clear %d comes first", want, w.next(0))
		}
	})
}
