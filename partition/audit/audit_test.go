package audit

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"go.uber.org/goleak"
	"pgregory.net/rapid"

	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

const shipped = "../../testdata/matrices/"

// write puts the three texts into new files.
func write(t testing.TB, matrix, right, answer string) Files {
	t.Helper()
	folder := t.TempDir()
	put := func(name, text string) string {
		path := filepath.Join(folder, name)
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		return path
	}
	return Files{put("A.mtx", matrix), put("b.mtx", right), put("x.mtx", answer)}
}

// vector is a Matrix Market array of so many columns.
func vector(columns int, v ...float64) string {
	var text strings.Builder
	fmt.Fprintf(&text, "%%%%MatrixMarket matrix array real general\n%d %d\n", len(v)/columns, columns)
	for _, x := range v {
		fmt.Fprintf(&text, "%.17g\n", x)
	}
	return text.String()
}

const (
	coordinate = "%%MatrixMarket matrix coordinate real general\n"
	complexOf  = "%%MatrixMarket matrix coordinate complex general\n"
	two        = coordinate + "2 2 3\n1 1 2\n1 2 1\n2 2 4\n" // [2 1; 0 4]
	complexTwo = "%%MatrixMarket matrix array complex general\n2 1\n"
)

// The expected numbers are worked out by hand.
func TestCheck(t *testing.T) {
	const e = epsilon
	cases := []struct {
		name                  string
		matrix, right, answer string
		want                  Result
	}{
		{"solved exactly", two, vector(1, 4, 8), vector(1, 1, 2), Result{Rows: 2, Unknowns: 2, Entries: 3, FirstZeroRow: -1, MatrixMax: 4, Met: true, Columns: []Column{{
			// |A||x| + |b| = (8, 16); by rows over 2 and 4: (4, 4), b (2, 2)
			TrueFloor: e * 2, ScaledFloor: e * 2, Right: math.Sqrt(80), Solution: math.Sqrt(5), RightMax: 8, SolutionMax: 2, Met: true}}}},
		{"first row wrong", two, vector(1, 7, 8), vector(1, 1, 2), Result{Rows: 2, Unknowns: 2, Entries: 3, FirstZeroRow: -1, MatrixMax: 4, Columns: []Column{{
			// r = (3, 0), size (11, 16); scaled r (1.5, 0), b (3.5, 2), size (5.5, 4)
			True: 3 / math.Sqrt(113), Scaled: 1.5 / math.Sqrt(16.25), RowWise: 3. / 11, Worst: []RowError{{Row: 0, Error: 3. / 11}}, Backward: 3. / 16,
			TrueFloor: e * math.Sqrt(377./113), ScaledFloor: e * math.Sqrt(46.25/16.25),
			Residual: 3, Right: math.Sqrt(113), Solution: math.Sqrt(5), ResidualMax: 3, RightMax: 8, SolutionMax: 2}}}},
		{"b = 0 and x = 0", two, vector(1, 0, 0), vector(1, 0, 0), Result{Rows: 2, Unknowns: 2, Entries: 3, FirstZeroRow: -1, MatrixMax: 4, Met: true, Columns: []Column{{Met: true}}}},
		{"b = 0 and another x", two, vector(1, 0, 0), vector(1, 0, 2), Result{Rows: 2, Unknowns: 2, Entries: 3, FirstZeroRow: -1, MatrixMax: 4, Columns: []Column{{
			True: math.Sqrt(68), Scaled: math.Sqrt(5), RowWise: 1, Worst: []RowError{{Row: 0, Error: 1}, {Row: 1, Error: 1}}, Backward: 1,
			TrueFloor: e * math.Sqrt(68), ScaledFloor: e * math.Sqrt(5), Residual: math.Sqrt(68), Solution: 2, ResidualMax: 8, SolutionMax: 2}}}},
		{"an empty row, a row of zeros, duplicates", coordinate + "3 3 4\n1 1 1\n3 3 0\n1 1 2\n1 1 -1\n", vector(1, 2, 3, 0), vector(1, 1, 1, 1),
			Result{Rows: 3, Unknowns: 3, Entries: 2, Duplicates: 2, ZeroRows: 2, FirstZeroRow: 1, MatrixMax: 2, Columns: []Column{{
				// r = (0, 3, 0); by rows over 2, 1, 1: b (1, 3, 0), size (2, 3, 0)
				True: 3 / math.Sqrt(13), Scaled: 3 / math.Sqrt(10), RowWise: 1, Worst: []RowError{{Row: 1, Error: 1}}, Backward: 3. / 5,
				TrueFloor: e * math.Sqrt(25./13), ScaledFloor: e * math.Sqrt(13./10),
				Residual: 3, Right: math.Sqrt(13), Solution: math.Sqrt(3), ResidualMax: 3, RightMax: 3, SolutionMax: 1}}}},
		{"more columns than rows", coordinate + "1 2 2\n1 1 1\n1 2 1\n", vector(1, 2), vector(1, 1, 1), Result{Rows: 1, Unknowns: 2, Entries: 2, FirstZeroRow: -1, MatrixMax: 2, Met: true, Columns: []Column{{
			TrueFloor: e * 2, ScaledFloor: e * 2, Right: 2, Solution: math.Sqrt2, RightMax: 2, SolutionMax: 1, Met: true}}}},
		{"two right sides, the second wrong", coordinate + "1 1 1\n1 1 2\n", vector(2, 2, 2), vector(2, 1, 0), Result{Rows: 1, Unknowns: 1, Entries: 1, FirstZeroRow: -1, MatrixMax: 2, Columns: []Column{
			{TrueFloor: e * 2, ScaledFloor: e * 2, Right: 2, Solution: 1, RightMax: 2, SolutionMax: 1, Met: true},
			{True: 1, Scaled: 1, RowWise: 1, Worst: []RowError{{Error: 1}}, Backward: 1, TrueFloor: e, ScaledFloor: e, Residual: 2, Right: 2, ResidualMax: 2, RightMax: 2}}}},
		{"complex: (1+2i)·(3−i) = 5+5i", complexOf + "1 1 1\n1 1 1 2\n", complexOf + "1 1 1\n1 1 5 5\n", complexOf + "1 1 1\n1 1 3 -1\n",
			Result{Rows: 2, Unknowns: 2, Complex: true, Entries: 4, FirstZeroRow: -1, MatrixMax: 3, Met: true, Columns: []Column{{
				// size: 3 + 2 + 5 and 6 + 1 + 5
				TrueFloor: e * math.Sqrt(244./50), ScaledFloor: e * math.Sqrt(244./50), Right: math.Sqrt(50), Solution: math.Sqrt(10), RightMax: 5, SolutionMax: 3, Met: true}}}},
		{"complex with a real right side: i·x = 2, x = −2i + 1", complexOf + "1 1 1\n1 1 0 1\n", vector(1, 2), complexOf + "1 1 1\n1 1 1 -2\n",
			Result{Rows: 2, Unknowns: 2, Complex: true, Entries: 4, FirstZeroRow: -1, MatrixMax: 1, Columns: []Column{{
				// r = −i: size (4, 1)
				True: 0.5, Scaled: 0.5, RowWise: 1, Worst: []RowError{{Imaginary: true, Error: 1}}, Backward: 1. / 4, TrueFloor: e * math.Sqrt(17) / 2, ScaledFloor: e * math.Sqrt(17) / 2,
				Residual: 1, Right: 2, Solution: math.Sqrt(5), ResidualMax: 1, RightMax: 2, SolutionMax: 2}}}},
		{"a real matrix with complex vectors", two, complexTwo + "4 3\n8 4\n", complexTwo + "1 1\n2 1\n", Result{Rows: 4, Unknowns: 4, Complex: true, Entries: 6, FirstZeroRow: -1, MatrixMax: 4, Met: true, Columns: []Column{{
			TrueFloor: e * 2, ScaledFloor: e * 2, Right: math.Sqrt(105), Solution: math.Sqrt(7), RightMax: 8, SolutionMax: 2, Met: true}}}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			c.want.Tolerance = 1e-8
			for _, memory := range []int64{0, 1} {
				got, err := Check(t.Context(), write(t, c.matrix, c.right, c.answer), Options{Memory: memory})
				if err != nil {
					t.Fatal(err)
				}
				if diff := cmp.Diff(&c.want, got, cmpopts.EquateApprox(4*e, 0), cmpopts.IgnoreFields(Result{}, "Bands")); diff != "" {
					t.Errorf("Check with memory %d −want +got:\n%s", memory, diff)
				}
			}
		})
	}
}

// A real matrix of a tokamak with its right side and a refined answer: every
// number is the exact one, and the answer is met.
func TestShippedSystem(t *testing.T) {
	f := Files{shipped + "utm300.mtx", shipped + "utm300_rhs.mtx", shipped + "utm300_xref.mtx"}
	got, err := Check(t.Context(), f, Options{Memory: 4096})
	if err != nil {
		t.Fatal(err)
	}
	if !got.Met || got.Bands < 5 || got.Columns[0].RowWise > 10*epsilon {
		t.Errorf("met %v in %d bands: %+v", got.Met, got.Bands, got.Columns[0])
	}
	m, _, errA := matfile.ReadMatrix(f.Matrix, matfile.Options{})
	b, _, errB := matfile.ReadDense(f.Right, matfile.Options{})
	x, _, errX := matfile.ReadDense(f.Answer, matfile.Options{})
	if err := errors.Join(errA, errB, errX); err != nil {
		t.Fatal(err)
	}
	want := exactAudit(m, x.Values, b.Values)
	rapid.Check(t, func(t *rapid.T) { compareColumn(t, got.Columns[0], want) })
}

// flowGrid writes the heads of a 100×100 grid of conductance 1e-9 whose left
// and right heads are fixed at 50 and 40, by rows of the identity or by a
// penalty on the flow equation; and as the answer the fixed heads with nothing
// between them.
func flowGrid(t *testing.T, penalty float64) Files {
	const side, conductance = 100, 1e-9
	var a csr.Triplets
	b, x := make([]float64, side*side), make([]float64, side*side)
	for i := range b {
		column, row := i%side, i/side
		if column == 0 || column == side-1 {
			x[i] = 50 - 10*float64(column/(side-1))
			a.Add(i, i, max(1, penalty))
			b[i] = max(1, penalty) * x[i]
			if penalty == 0 {
				continue
			}
		}
		for _, d := range [][2]int{{-1, 0}, {1, 0}, {0, -1}, {0, 1}} {
			if c, r := column+d[0], row+d[1]; c >= 0 && c < side && r >= 0 && r < side {
				a.Add(i, i, conductance)
				a.Add(i, c+side*r, -conductance)
			}
		}
	}
	f := write(t, "", vector(1, b...), vector(1, x...))
	f.Matrix = filepath.Join(filepath.Dir(f.Matrix), "grid.mtx")
	if err := matfile.WriteMatrix(f.Matrix, a.Matrix(side*side, side*side), matfile.WriteOptions{}); err != nil {
		t.Fatal(err)
	}
	return f
}

// A small residual in badly scaled units proves nothing: the scaled one tells.
func TestHeadsLeftAtZeroAreShort(t *testing.T) {
	for name, penalty := range map[string]float64{"identity rows": 0, "penalty rows": 1e12} {
		got, err := Check(t.Context(), flowGrid(t, penalty), Options{})
		if err != nil {
			t.Fatal(err)
		}
		c := got.Columns[0]
		if c.True > 1e-8 || c.Scaled < 0.1 || c.RowWise != 1 || got.Met {
			t.Errorf("%s: true %.2g, scaled %.2g, row-wise %v, met %v; want a small true residual and short", name, c.True, c.Scaled, c.RowWise, got.Met)
		}
	}
}

func TestWorstRowsAreTheEightWorst(t *testing.T) {
	c := columnSums{}
	for k, e := range []float64{1, 5, 2, 5, 9, 0.5, 3, 4, 7, 6, 5} {
		c.note(RowError{Row: k, Error: e})
	}
	want := []RowError{{Row: 4, Error: 9}, {Row: 8, Error: 7}, {Row: 9, Error: 6}, {Row: 1, Error: 5}, {Row: 3, Error: 5}, {Row: 10, Error: 5}, {Row: 7, Error: 4}, {Row: 6, Error: 3}}
	if diff := cmp.Diff(want, c.worst); diff != "" {
		t.Errorf("−want +got:\n%s", diff)
	}
}

// Bands follow each other, fit the memory or are a single row, and none could
// take the next row.
func TestCutBands(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		counts := rapid.SliceOfN(rapid.IntRange(0, 50), 0, 60).Draw(t, "entries")
		memory := rapid.Int64Range(1, 3000).Draw(t, "memory")
		at := 0
		for _, r := range cutBands(counts, memory) {
			need := int64(0)
			for _, n := range counts[r.lo:r.hi] {
				need += bytesPerRow + bytesPerEntry*int64(n)
			}
			if r.lo != at || r.hi <= r.lo || (need > memory && r.hi > r.lo+1) {
				t.Fatalf("band %v of %d bytes", r, need)
			}
			if r.hi < len(counts) && need+bytesPerRow+bytesPerEntry*int64(counts[r.hi]) <= memory {
				t.Fatalf("band %v ends early", r)
			}
			at = r.hi
		}
		if at != len(counts) {
			t.Fatalf("bands end at %d of %d", at, len(counts))
		}
	})
}

func TestRefusals(t *testing.T) {
	good := vector(1, 1, 1)
	cases := []struct {
		name                  string
		matrix, right, answer string
		options               Options
		fault                 string
	}{
		{"NaN in x", two, good, "%%MatrixMarket matrix array real general\n2 1\n1\nNaN\n", Options{}, "x.mtx, line 4"},
		{"x too short", two, good, vector(1, 1), Options{}, "x.mtx: expected 2 rows"},
		{"b too long", two, vector(1, 1, 1, 1), good, Options{}, "b.mtx: expected 2 rows"},
		{"b of two columns", two, vector(2, 1, 1, 1, 1), good, Options{}, "x.mtx: expected 2 columns"},
		{"complex b too short", complexOf + "2 2 1\n1 1 1 1\n", vector(1, 1), good, Options{}, "expected 2 rows, as"},
		{"truncated matrix", coordinate + "2 2 3\n1 1 1\n", good, good, Options{}, "A.mtx, line 3"},
		{"duplicates without a finite sum", coordinate + "2 2 3\n1 1 1\n2 2 1.5e308\n2 2 1.5e308\n", good, good, Options{}, "row 2: expected entries whose sum is finite, found +Inf in column 2"},
		{"negative tolerance", two, good, good, Options{Tolerance: -1}, "tolerance -1"},
		{"negative memory", two, good, good, Options{Memory: -1}, "-1 bytes"},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			got, err := Check(t.Context(), write(t, c.matrix, c.right, c.answer), c.options)
			if err == nil || !strings.Contains(err.Error(), c.fault) {
				t.Errorf("Check = %+v, error %v; want one that says %q", got, err, c.fault)
			}
		})
	}
	f := write(t, two, good, good)
	for _, lost := range []*string{&f.Matrix, &f.Right, &f.Answer} {
		kept := *lost
		*lost += ".gone"
		if _, err := Check(t.Context(), f, Options{}); !errors.Is(err, os.ErrNotExist) {
			t.Errorf("without %s: error %v", *lost, err)
		}
		*lost = kept
	}
}

func TestMatrixThatChangesBetweenPasses(t *testing.T) {
	f := write(t, two, vector(1, 1, 1), vector(1, 1, 1))
	for name, text := range map[string]string{
		"another size": coordinate + "2 2 1\n1 1 2\n",
		"other rows":   coordinate + "2 2 3\n1 1 2\n2 1 1\n2 2 4\n",
	} {
		if err := os.WriteFile(f.Matrix, []byte(two), 0o644); err != nil {
			t.Fatal(err)
		}
		s, err := open(f, Options{})
		if err != nil {
			t.Fatal(err)
		}
		counts, err := s.count(t.Context())
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(f.Matrix, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		bands := cutBands(counts, 1<<20)
		if err := s.fill(t.Context(), newBand(bands, counts), bands[0], counts); err == nil || !strings.Contains(err.Error(), "the same entries in every pass") {
			t.Errorf("%s: error %v", name, err)
		}
	}
}

func TestCancelled(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := Check(ctx, write(t, two, vector(1, 1, 1), vector(1, 1, 1)), Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("Check with a cancelled context: error %v", err)
	}
}

func BenchmarkCheck(b *testing.B) {
	const side = 60
	var a csr.Triplets
	for i := range side * side * side {
		a.Add(i, i, 6.1)
		for _, d := range []int{1, side, side * side} {
			if i+d < side*side*side {
				a.Add(i, i+d, -1.01)
				a.Add(i+d, i, -0.99)
			}
		}
	}
	m := a.Matrix(side*side*side, side*side*side)
	x := make([]float64, m.Rows)
	for i := range x {
		x[i] = 1 / float64(i+1)
	}
	right := make([]float64, m.Rows)
	m.Mul(right, x)
	f := write(b, "", vector(1, right...), vector(1, x...))
	f.Matrix = filepath.Join(filepath.Dir(f.Matrix), "grid.mtx")
	if err := matfile.WriteMatrix(f.Matrix, m, matfile.WriteOptions{}); err != nil {
		b.Fatal(err)
	}
	size, err := os.Stat(f.Matrix)
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(size.Size())
	for b.Loop() {
		if r, err := Check(b.Context(), f, Options{}); err != nil || !r.Met {
			b.Fatal(r, err)
		}
	}
}
