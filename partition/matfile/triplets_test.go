package matfile

import (
	"errors"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestTriplets(t *testing.T) {
	for name, test := range map[string]struct {
		text string
		base IndexBase
		want [][]float64
	}{
		"zero seen":  {"0 0 1\n1 2 3\n", UnknownBase, [][]float64{{1, 0, 0}, {0, 0, 3}}},
		"one given":  {"# comment\n\n1 1 1\n% another\n2 3 3", OneBased, [][]float64{{1, 0, 0}, {0, 0, 3}}},
		"zero given": {"1 1 1\n1 1 2\n", ZeroBased, [][]float64{{0, 0}, {0, 3}}},
		"complex":    {"1 1 3 4\n", OneBased, [][]float64{{3, -4}, {4, 3}}},
		"CRLF, tabs": {"1\t1\t3e0\r\n", OneBased, [][]float64{{3}}},
	} {
		t.Run(name, func(t *testing.T) {
			m, h, err := ReadMatrix(write(t, "a.txt", test.text), Options{IndexBase: test.base})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(test.want, dense(m)); diff != "" || h.Format != "triplets" {
				t.Errorf("%+v: want −, got +:\n%s", h, diff)
			}
		})
	}
}

func TestTripletRefusals(t *testing.T) {
	for name, test := range map[string]struct {
		text       string
		base       IndexBase
		want, flag string
	}{
		"base unknown":      {"1 1 1\n2 2 2\n", UnknownBase, "expected to be told whether rows and columns count from 0 or 1", "--index-base 1 (or 0)"},
		"zero in one-based": {"1 1 1\n0 2 2\n", OneBased, `line 2: expected a row index between 1 and 2147483647, found "0"`, "--index-base 0"},
		"negative":          {"0 0 1\n-1 2 2\n", UnknownBase, `line 2: expected a row index between 0 and 2147483646, found "-1"`, ""},
		"beyond int32":      {"0 0 1\n0 2147483648 2\n", UnknownBase, "line 2: expected a column index", ""},
		"text":              {"0 0 1\n1 1 one\n", UnknownBase, `line 2, row 2: expected a finite number, found "one"`, ""},
		"two words":         {"0 0\n", UnknownBase, "line 1: expected lines of row, column and value", ""},
		"a short line":      {"0 0 1\n\n1 1\n", UnknownBase, "line 3, row 2: expected a row, a column and a value", ""},
		"banner too late":   {"\n" + coordinate + "1 1 1\n1 1 1\n", OneBased, "line 2: expected %%MatrixMarket as the very first bytes", ""},
		"comments alone":    {"# nothing\n", UnknownBase, "line 1: expected a line of numbers, found the end of the file", ""},
		"few, far apart":    {"0 0 1\n2000000000 0 1\n", UnknownBase, "expected rows in proportion to 2 entries", ""},
	} {
		t.Run(name, func(t *testing.T) {
			_, _, err := ReadMatrix(write(t, "a.txt", test.text), Options{IndexBase: test.base})
			var bad *FileError
			if !errors.As(err, &bad) || !strings.Contains(err.Error(), test.want) || bad.Flag != test.flag {
				t.Errorf("error is %v, want %q in it and the flag %q", err, test.want, test.flag)
			}
		})
	}
}

func TestListsOfNumbers(t *testing.T) {
	for name, test := range map[string]struct {
		text string
		base IndexBase
		want Dense
	}{
		"a number a line":      {"1\n# c\n-2.5e3\n\n3", UnknownBase, Dense{3, 1, false, []float64{1, -2500, 3}}},
		"a table":              {"1 2\n3 4\n", UnknownBase, Dense{2, 2, false, []float64{1, 3, 2, 4}}},
		"three columns":        {"1.5 2 3\n4 5 6\n", UnknownBase, Dense{2, 3, false, []float64{1.5, 4, 2, 5, 3, 6}}},
		"triplets as a vector": {"1 1 5\n3 1 7\n", OneBased, Dense{3, 1, false, []float64{5, 0, 7}}},
	} {
		t.Run(name, func(t *testing.T) {
			d, h, err := ReadDense(write(t, "b.txt", test.text), Options{IndexBase: test.base})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(test.want, *d); diff != "" || h.Rows != d.Rows || h.Cols != d.Cols {
				t.Errorf("%+v: want −, got +:\n%s", h, diff)
			}
		})
	}
	for text, want := range map[string]string{
		"1 2\n3\n":     "line 2: expected 2 numbers on the line, found 1",
		"1\nx\n":       `line 2: expected a finite number, found "x"`,
		"1 1 5\n2 1 6": "three columns that could be rows, columns and values; accepted with --index-base",
	} {
		if _, _, err := ReadDense(write(t, "b.txt", text), Options{}); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error is %v, want %q in it", text, err, want)
		}
	}
}
