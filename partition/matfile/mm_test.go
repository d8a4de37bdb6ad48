package matfile

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/goleak"

	"rowstead/partition/csr"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// write puts text into a new file and returns its path.
func write(t testing.TB, name, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// dense returns the rows of m as a table.
func dense(m *csr.Matrix) [][]float64 {
	out := make([][]float64, m.Rows)
	for i := range out {
		out[i] = make([]float64, m.Cols)
		cols, vals := m.Row(i)
		for k, c := range cols {
			out[i][c] = vals[k]
		}
	}
	return out
}

func TestMatrixMarketForms(t *testing.T) {
	for name, test := range map[string]struct {
		text string
		want [][]float64
	}{
		"general":               {"%%MatrixMarket matrix coordinate real general\n% c\n\n2 3 3\n1 1 1.5\n2 3 -2e-1\n1 2 4\n", [][]float64{{1.5, 4, 0}, {0, 0, -.2}}},
		"duplicates are summed": {"%%MatrixMarket matrix coordinate real general\n1 2 3\n1 2 1\n1 1 5\n1 2 2\n", [][]float64{{5, 3}}},
		"any case, CRLF, tabs, blanks, comments between": {"%%matrixmarket MATRIX Coordinate Real General\r\n%x\r\n 2 2 2 \r\n\t1\t1\t 1.5 \r\n%%\r\n  2 2  3\r\n\r\n", [][]float64{{1.5, 0}, {0, 3}}},
		"no line end at the end":                         {"%%MatrixMarket matrix coordinate integer general\n1 1 1\n1 1 -7", [][]float64{{-7}}},
		"pattern":                                        {"%%MatrixMarket matrix coordinate pattern general\n2 2 2\n1 2\n2 1\n", [][]float64{{0, 1}, {1, 0}}},
		"symmetric":                                      {"%%MatrixMarket matrix coordinate real symmetric\n2 2 2\n1 1 1\n2 1 3\n", [][]float64{{1, 3}, {3, 0}}},
		"skew-symmetric":                                 {"%%MatrixMarket matrix coordinate real skew-symmetric\n2 2 2\n2 1 3\n2 2 0\n", [][]float64{{0, -3}, {3, 0}}},
		"complex":                                        {"%%MatrixMarket matrix coordinate complex general\n1 2 1\n1 2 3 4\n", [][]float64{{0, 0, 3, -4}, {0, 0, 4, 3}}},
		"hermitian":                                      {"%%MatrixMarket matrix coordinate complex hermitian\n2 2 2\n1 1 5 0\n2 1 3 4\n", [][]float64{{5, 0, 3, 4}, {0, 5, -4, 3}, {3, -4, 0, 0}, {4, 3, 0, 0}}},
		"complex symmetric":                              {"%%MatrixMarket matrix coordinate complex symmetric\n2 2 1\n2 1 3 4\n", [][]float64{{0, 0, 3, -4}, {0, 0, 4, 3}, {3, -4, 0, 0}, {4, 3, 0, 0}}},
		"array":                                          {"%%MatrixMarket matrix array real general\n2 2\n1\n2\n3\n0\n", [][]float64{{1, 3}, {2, 0}}},
		"array, several a line":                          {"%%MatrixMarket matrix array integer general\n2 2\n1 2\n% between\n3 4\n", [][]float64{{1, 3}, {2, 4}}},
		"array symmetric":                                {"%%MatrixMarket matrix array real symmetric\n2 2\n1\n2\n3\n", [][]float64{{1, 2}, {2, 3}}},
		"array skew-symmetric":                           {"%%MatrixMarket matrix array real skew-symmetric\n3 3\n1\n2\n3\n", [][]float64{{0, -1, -2}, {1, 0, -3}, {2, 3, 0}}},
		"array hermitian":                                {"%%MatrixMarket matrix array complex hermitian\n2 2\n1 0\n2 3\n4 0\n", [][]float64{{1, 0, 2, 3}, {0, 1, -3, 2}, {2, -3, 4, 0}, {3, 2, 0, 4}}},
	} {
		t.Run(name, func(t *testing.T) {
			m, h, err := ReadMatrix(write(t, "a.mtx", test.text), Options{})
			if err != nil {
				t.Fatal(err)
			}
			if err := m.Check(); err != nil {
				t.Error(err)
			}
			if diff := cmp.Diff(test.want, dense(m)); diff != "" {
				t.Errorf("want −, got +:\n%s", diff)
			}
			if h.Rows != m.Rows || h.Cols != m.Cols {
				t.Errorf("header says %d by %d, matrix is %d by %d", h.Rows, h.Cols, m.Rows, m.Cols)
			}
		})
	}
}

func TestMatrixMarketVectors(t *testing.T) {
	for name, test := range map[string]struct {
		text string
		want Dense
	}{
		"array":              {"%%MatrixMarket matrix array real general\n2 2\n1\n2\n3\n4\n", Dense{2, 2, false, []float64{1, 2, 3, 4}}},
		"complex array":      {"%%MatrixMarket matrix array complex general\n2 1\n1 2\n3 4\n", Dense{4, 1, true, []float64{1, 2, 3, 4}}},
		"coordinate":         {"%%MatrixMarket matrix coordinate real general\n3 2 3\n3 1 5\n2 2 6\n3 1 1\n", Dense{3, 2, false, []float64{0, 0, 6, 0, 6, 0}}},
		"complex coordinate": {"%%MatrixMarket matrix coordinate complex general\n2 1 1\n2 1 5 6\n", Dense{4, 1, true, []float64{0, 0, 5, 6}}},
		"symmetric array":    {"%%MatrixMarket matrix array real symmetric\n2 2\n1\n2\n3\n", Dense{2, 2, false, []float64{1, 2, 2, 3}}},
	} {
		t.Run(name, func(t *testing.T) {
			d, h, err := ReadDense(write(t, "b.mtx", test.text), Options{})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(test.want, *d); diff != "" {
				t.Errorf("want −, got +:\n%s", diff)
			}
			if h.Rows != d.Rows || h.Cols != d.Cols || h.Complex != d.Complex {
				t.Errorf("header %+v does not fit %+v", h, d)
			}
		})
	}
}

const coordinate = "%%MatrixMarket matrix coordinate real general\n"

func TestMatrixMarketRefusals(t *testing.T) {
	for name, test := range map[string]struct{ text, want string }{
		"empty":                     {"", "expected a matrix or vector file, found an empty file"},
		"header alone":              {coordinate, "line 1: expected the line with the sizes, found the end of the file"},
		"object":                    {"%%MatrixMarket vector coordinate real general\n", `line 1: expected matrix, found "vector"`},
		"too few words":             {"%%MatrixMarket matrix coordinate\n", "line 1: expected %%MatrixMarket matrix, layout, field and symmetry"},
		"field":                     {"%%MatrixMarket matrix coordinate quaternion general\n", `line 1: expected real or integer or pattern or complex, found "quaternion"`},
		"array pattern":             {"%%MatrixMarket matrix array pattern general\n", "line 1: expected real, integer or complex in an array file"},
		"real hermitian":            {"%%MatrixMarket matrix coordinate real hermitian\n", "line 1: expected complex in a hermitian file"},
		"sizes":                     {coordinate + "%\n3 3\n", `line 3: expected rows, columns and entries, found "3 3"`},
		"sizes in words":            {coordinate + "3 x 1\n", `line 2: expected rows, columns and entries, found "x"`},
		"negative size":             {coordinate + "-3 3 1\n", `found "-3"`},
		"absurd size":               {coordinate + "3000000000 3 1\n1 1 1\n", "line 2: expected between 1 and 2147483647 rows and columns"},
		"absurd complex size":       {"%%MatrixMarket matrix coordinate complex general\n1073741824 3 1\n1 1 1 1\n", "line 2: expected between 1 and 1073741823 rows and columns"},
		"absurd count":              {coordinate + "3 3 900000000000\n1 1 1\n", "line 2: expected 900000000000 entries, found a file of 69 bytes"},
		"rows nearly all empty":     {coordinate + "2000000000 2000000000 1\n1 1 1\n", "expected rows in proportion to 1 entries"},
		"no rows":                   {coordinate + "0 3 0\n", "line 2: expected between 1"},
		"too few entries":           {coordinate + "2 2 3\n1 1 1\n%\n2 2 2\n", "line 5: expected 3 entries, found the end of the file after 2"},
		"too many entries":          {coordinate + "2 2 1\n%\n1 1 1\n\n2 2 2\n", "line 6: expected the end of the file after 1 entry, found another entry"},
		"row 0":                     {coordinate + "2 2 1\n0 1 1\n", `line 3: expected a row index between 1 and 2, found "0"`},
		"row beyond":                {coordinate + "2 2 1\n3 1 1\n", `line 3: expected a row index between 1 and 2, found "3"`},
		"column beyond":             {coordinate + "2 2 1\n1 3 1\n", `line 3: expected a column index between 1 and 2, found "3"`},
		"negative column":           {coordinate + "2 2 1\n1 -3 1\n", `line 3: expected a column index between 1 and 2, found "-3"`},
		"long index":                {coordinate + "2 2 1\n1 18446744073709551617 1\n", `found "18446744073709551617"`},
		"index with a point":        {coordinate + "2 2 1\n1.0 1 1\n", `expected a row index between 1 and 2, found "1.0"`},
		"NaN":                       {coordinate + "2 2 2\n1 1 1\n2 1 NaN\n", `line 4, row 2: expected a finite number, found "NaN"`},
		"infinity":                  {coordinate + "2 2 1\n1 1 -inf\n", `line 3, row 1: expected a finite number, found "-inf"`},
		"too large a number":        {coordinate + "2 2 1\n1 1 1e999\n", `line 3, row 1: expected a finite number, found "1e999"`},
		"text":                      {coordinate + "2 2 1\n1 1 hello\n", `line 3, row 1: expected a finite number, found "hello"`},
		"decimal comma":             {coordinate + "2 2 1\n1 1 1,5\n", `expected a finite number, found "1,5"`},
		"no value":                  {coordinate + "2 2 1\n1 1\n", `line 3, row 1: expected a row, a column and a value, found "1 1"`},
		"one word":                  {coordinate + "2 2 1\n1\n", `line 3: expected a row, a column and a value, found "1"`},
		"a value too many":          {coordinate + "2 2 1\n1 1 1 1\n", "line 3, row 1: expected a row, a column and a value"},
		"point in an integer file":  {"%%MatrixMarket matrix coordinate integer general\n2 2 1\n1 1 1.5\n", `expected an integer, found "1.5"`},
		"upper triangle":            {"%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 2 1\n", "line 3, row 1: expected only entries of the lower triangle (row ≥ column) in a symmetric file, found row 1, column 2"},
		"skew diagonal":             {"%%MatrixMarket matrix coordinate real skew-symmetric\n2 2 1\n2 2 1\n", "line 3, row 2: expected zero on the diagonal of a skew-symmetric file"},
		"hermitian diagonal":        {"%%MatrixMarket matrix coordinate complex hermitian\n2 2 1\n2 2 1 1\n", "line 3, row 2: expected a real diagonal in a hermitian file"},
		"symmetric rectangle":       {"%%MatrixMarket matrix coordinate real symmetric\n2 3 0\n", "line 2: expected as many rows as columns in a symmetric file"},
		"array too short":           {"%%MatrixMarket matrix array real general\n2 2\n1\n2\n3\n", "line 5: expected 4 numbers, found the end of the file after 3"},
		"array too long":            {"%%MatrixMarket matrix array real general\n2 1\n1\n2\n\n3\n", "line 6: expected the end of the file after 2 numbers, found another number"},
		"array text":                {"%%MatrixMarket matrix array real general\n2 1\n1\nx\n", `line 4: expected a finite number, found "x"`},
		"complex array, one a line": {"%%MatrixMarket matrix array complex general\n1 1\n1\n2\n", "line 3: expected 2 numbers on the line, found 1"},
		"sum of duplicates":         {coordinate + "2 2 2\n2 1 1e308\n2 1 1e308\n", "row 2: expected duplicates whose sum is finite"},
		"UTF-16":                    {"\xff\xfe%\x00%\x00", "UTF-16 text"},
		"byte order mark":           {"\xef\xbb\xbf" + coordinate + "1 1 1\n1 1 1\n", "byte order mark"},
		"unknown":                   {"hello world\n", "expected a file that begins with %%MatrixMarket"},
		"NUL":                       {coordinate + "2 2 1\n1 1 \x00\n", `found "\x00"`},
	} {
		t.Run(name, func(t *testing.T) {
			path := write(t, "a.mtx", test.text)
			m, _, err := ReadMatrix(path, Options{})
			if err == nil {
				t.Fatalf("no error, matrix %v", dense(m))
			}
			var bad *FileError
			if !errors.As(err, &bad) || !strings.Contains(err.Error(), test.want) || !strings.HasPrefix(err.Error(), path) {
				t.Errorf("error is %v\nwant %q in it", err, test.want)
			}
			if _, _, err := ReadDense(path, Options{}); err == nil {
				t.Error("ReadDense accepts it")
			}
		})
	}
}

// Chunks of any size, threads of any number: the same entries in the same order.
func TestChunkSizesAgree(t *testing.T) {
	var text strings.Builder
	fmt.Fprintf(&text, "%s%%\n40 40 400\n", coordinate)
	for k := range 400 {
		fmt.Fprintf(&text, "%d %d %v\n", k%7*5+1, k*k%40+1, float64(k)/3)
		if k%11 == 0 {
			text.WriteString("% a comment that is longer than the other lines\n\n")
		}
	}
	path := write(t, "a.mtx", text.String())
	want := entriesOf(t, path, Options{Threads: 1})
	for _, o := range []Options{{Threads: 1, ChunkSize: 1}, {Threads: 3, ChunkSize: 17}, {Threads: 2, ChunkSize: 100}, {Threads: 8, ChunkSize: 1000}} {
		if diff := cmp.Diff(want, entriesOf(t, path, o)); diff != "" {
			t.Errorf("%+v: want −, got +:\n%s", o, diff)
		}
	}
	m, _, err := ReadMatrix(path, Options{ChunkSize: 64})
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(want.Matrix(40, 40), m); diff != "" {
		t.Errorf("assembled otherwise than csr does: want −, got +:\n%s", diff)
	}
}

// entriesOf streams all entries of a file.
func entriesOf(t testing.TB, path string, o Options) *csr.Triplets {
	t.Helper()
	r, err := Open(path, o)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	all, part := &csr.Triplets{}, csr.Triplets{}
	for {
		err := r.Next(&part)
		if err == io.EOF {
			return all
		}
		if err != nil {
			t.Fatal(err)
		}
		all.I, all.J, all.V = append(all.I, part.I...), append(all.J, part.J...), append(all.V, part.V...)
	}
}

func TestStoppingEarlyLeaksNothing(t *testing.T) {
	path := write(t, "a.mtx", coordinate+"9 9 9\n"+strings.Repeat("1 1 1\n", 9))
	for _, reads := range []int{0, 1, 3} {
		r, err := Open(path, Options{Threads: 3, ChunkSize: 6})
		if err != nil {
			t.Fatal(err)
		}
		var part csr.Triplets
		for range reads {
			if err := r.Next(&part); err != nil {
				t.Fatal(err)
			}
		}
		if err := r.Close(); err != nil {
			t.Error(err)
		}
		if err := r.Next(&part); err == nil {
			t.Error("Next works after Close")
		}
	}
}
