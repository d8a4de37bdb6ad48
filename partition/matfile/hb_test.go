package matfile

import (
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// boeing builds a file from its parts; cards are counted from the parts.
func boeing(kind, sizes, formats, right string, parts ...string) string {
	var b strings.Builder
	total := 0
	counts := make([]int, 4)
	for k, part := range parts {
		counts[k] = strings.Count(part, "\n")
		total += counts[k]
	}
	fmt.Fprintf(&b, "%-72s%-8s\n", "A title", "KEY")
	fmt.Fprintf(&b, "%14d%14d%14d%14d%14d\n", total, counts[0], counts[1], counts[2], counts[3])
	fmt.Fprintf(&b, "%-14s%s\n%s\n%s", kind, sizes, formats, right)
	for _, part := range parts {
		b.WriteString(part)
	}
	return b.String()
}

// columns pads words to the widths of Harwell-Boeing header lines.
func columns(width int, words ...any) string {
	var b strings.Builder
	for _, w := range words {
		fmt.Fprintf(&b, "%*v", width, w)
	}
	return b.String()
}

func formats(pointer, index, value, right string) string {
	return fmt.Sprintf("%-16s%-16s%-20s%-20s", pointer, index, value, right)
}

// tight is [[1, 0, 3], [0, -20, 4e5]] with numbers that touch.
func tight() string {
	return boeing("RUA", columns(14, 2, 3, 4, 0), formats("(4I1)", "(2I1)", "(2E10.3)", ""), "",
		"1235\n", "12\n12\n", " 1.000E+00-2.000E+01\n 3.000E+00 4.000E+05\n")
}

func TestBoeingMatrices(t *testing.T) {
	want := [][]float64{{1, 0, 3}, {0, -20, 4e5}}
	rua := func(valueFormat, values string) string {
		return boeing("RUA", columns(14, 2, 3, 4, 0), formats("(10I3)", "(16I5)", valueFormat, ""), "", "  1  2  3  5\n", "    1    2    1    2\n", values)
	}
	for name, test := range map[string]struct {
		text string
		want [][]float64
	}{
		"numbers that touch":     {tight(), want},
		"scale and D exponents":  {rua("(1P,4D12.4)", "  1.0000D+00 -2.0000D+01  3.0000D+00  4.0000D+05\n"), want},
		"scale without comma":    {rua("(1P4E12.4)", "  1.0000E+00 -2.0000E+01  3.0000E+00  4.0000E+05\n"), want},
		"exponent has no letter": {rua("(4E12.4)", "  1.0000+000 -2.0000+001  3.0000+000  4.0000+005\n"), want},
		"implied point":          {rua("(4F8.2)", "     100   -2000     300 4.0E+05\n"), want},
		"scale divides":          {rua("(2P,4F10.1)", "     100.0   -2000.0     300.04.0000E+05\n"), want},
		"group with blanks":      {rua("(2(1X,E11.4))", "  1.0000E+00 -2.0000E+01\n  3.0000E+00  4.0000E+05\n"), want},
		"blanks inside a field":  {rua("(4E12.4)", "  1.0000E+ 0 -2.0000E+ 1  3.0000E+ 0  4.0000E+ 5\n"), want},
		"trailing blanks, CRLF":  {strings.ReplaceAll(rua("(4E12.4)", "  1.0000E+00 -2.0000E+01  3.0000E+00  4.0000E+05  \n"), "\n", " \r\n"), want},
		"pattern":                {boeing("PUA", columns(14, 2, 2, 2, 0), formats("(10I3)", "(16I5)", "", ""), "", "  1  2  3\n", "    2    1\n"), [][]float64{{0, 1}, {1, 0}}},
		"symmetric":              {boeing("RSA", columns(14, 2, 2, 2, 0), formats("(10I3)", "(16I5)", "(4F5.1)", ""), "", "  1  3  3\n", "    1    2\n", "  2.0  3.0\n"), [][]float64{{2, 3}, {3, 0}}},
		"skew-symmetric":         {boeing("RZA", columns(14, 2, 2, 1, 0), formats("(10I3)", "(16I5)", "(4F5.1)", ""), "", "  1  2  2\n", "    2\n", "  3.0\n"), [][]float64{{0, -3}, {3, 0}}},
		"complex":                {boeing("CUA", columns(14, 1, 1, 1, 0), formats("(10I3)", "(16I5)", "(3F5.1)", ""), "", "  1  2\n", "    1\n", "  3.0  4.0\n"), [][]float64{{3, -4}, {4, 3}}},
		"integer, small letters": {boeing("iua", columns(14, 1, 1, 1, 0), formats("(10i3)", "(16i5)", "(3i5)", ""), "", "  1  2\n", "    1\n", "   -7\n"), [][]float64{{-7}}},
		"right sides behind":     {boeing("RUA", columns(14, 1, 1, 1, 0), formats("(10I3)", "(16I5)", "(3F5.1)", "(3F5.1)"), "F             "+columns(14, 1, 0)+"\n", "  1  2\n", "    1\n", "  3.0\n", "  9.0\n"), [][]float64{{3}}},
	} {
		t.Run(name, func(t *testing.T) {
			m, h, err := ReadMatrix(write(t, "a.rua", test.text), Options{})
			if err != nil {
				t.Fatalf("%v\n%s", err, test.text)
			}
			if diff := cmp.Diff(test.want, dense(m)); diff != "" || h.Title != "A title" {
				t.Errorf("%+v: want −, got +:\n%s", h, diff)
			}
		})
	}
}

func TestBoeingRightSides(t *testing.T) {
	head := func(kind string, columnCount, entries int) string {
		return fmt.Sprintf("%-14s%s\n", kind, columns(14, columnCount, entries))
	}
	file := func(right, parts string) string {
		return boeing("RUA", columns(14, 3, 1, 1, 0), formats("(10I3)", "(16I5)", "(2F5.1)", "(2F5.1)"), right, "  1  2\n", "    1\n", "  3.0\n", parts)
	}
	for name, test := range map[string]struct {
		text string
		want Dense
	}{
		"full, one behind the other": {file(head("F", 2, 0), "  1.0  2.0\n  3.0  4.0\n  5.0  6.0\n"), Dense{3, 2, false, []float64{1, 2, 3, 4, 5, 6}}},
		"full, each on a new line":   {file(head("F", 2, 0), "  1.0  2.0\n  3.0\n  4.0  5.0\n  6.0\n"), Dense{3, 2, false, []float64{1, 2, 3, 4, 5, 6}}},
		"guess and answer behind":    {file(head("FGX", 1, 0), "  1.0  2.0\n  3.0\n  4.0  5.0\n  6.0\n  7.0  8.0\n  9.0\n"), Dense{3, 1, false, []float64{1, 2, 3}}},
		"sparse":                     {file(head("M", 2, 2), "  1  2  3\n    3    1\n  7.0  8.0\n"), Dense{3, 2, false, []float64{0, 0, 7, 8, 0, 0}}},
		"complex": {boeing("CUA", columns(14, 2, 1, 1, 0), formats("(10I3)", "(16I5)", "(2F5.1)", "(2F5.1)"), head("F", 1, 0), "  1  2\n", "    1\n", "  3.0  3.0\n", "  1.0  2.0\n  3.0  4.0\n"),
			Dense{4, 1, true, []float64{1, 2, 3, 4}}},
	} {
		t.Run(name, func(t *testing.T) {
			path := write(t, "a.rua", test.text)
			d, _, err := ReadDense(path, Options{})
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(test.want, *d); diff != "" {
				t.Errorf("want −, got +:\n%s", diff)
			}
			if _, _, err := ReadMatrix(path, Options{}); err != nil {
				t.Errorf("the matrix before: %v", err)
			}
		})
	}
	if _, _, err := ReadDense(write(t, "a.rua", tight()), Options{}); err == nil || !strings.Contains(err.Error(), "line 2: expected right sides, found none") {
		t.Errorf("no right side: %v", err)
	}
}

func TestBoeingRefusals(t *testing.T) {
	long := boeing("RUA", columns(14, 2, 1, 1, 0), formats("(4I1)", "(2I1)", "(2E10.3)", ""), "", "12\n", "12\n", " 1.000E+00\n")
	if _, _, err := ReadMatrix(write(t, "a.rua", long), Options{}); err == nil || !strings.Contains(err.Error(), "line 6: expected the end of the row indices, found \"2\"") {
		t.Errorf("an index too many: %v", err)
	}
	for name, test := range map[string]struct{ old, new, want string }{
		"elements":                {"RUA ", "RUE ", "line 3: expected an assembled matrix"},
		"format":                  {"(2I1) ", "(2Z1) ", "line 4: expected a Fortran format of the indices"},
		"real format for indices": {"(2I1) ", "(2F1.0)", "line 4: expected a Fortran format of the indices"},
		"absurd entries":          {"             4             0", "     400000000             0", "line 2: expected 200000000 lines of indices"},
		"absurd columns":          {"             3             4", "    3000000000             4", "line 3: expected between 1 and 2147483647"},
		"line counts":             {"             5             1", "             5             2", "line 2: expected 1 lines of pointers, which 4 numbers take, found 2"},
		"row 0":                   {"\n12\n12\n", "\n02\n12\n", "line 6: expected a row index between 1 and 2, found 0"},
		"row beyond":              {"\n12\n12\n", "\n12\n13\n", "line 7: expected a row index between 1 and 2, found 3"},
		"row in letters":          {"\n12\n12\n", "\n1x\n12\n", `line 6: expected a whole number in columns 2 to 2 (row indices), found "x"`},
		"short line":              {"\n12\n12\n", "\n1\n12\n", `line 6: expected a whole number in columns 2 to 2 (row indices), found ""`},
		"pointers descend":        {"\n1235\n", "\n1325\n", "line 5: expected column pointers that ascend to 5, found 2 after 3"},
		"first pointer":           {"\n1235\n", "\n0235\n", "line 5: expected 1 as the first column pointer, found 0"},
		"last pointer":            {"\n1235\n", "\n1234\n", "line 5: expected more column pointers, found their end"},
		"pointer too far":         {"\n1235\n", "\n1236\n", "found 6 after 3"},
		"NaN":                     {" 4.000E+05", "       NaN", `line 9: expected a finite number in columns 11 to 20 (values), found "NaN"`},
		"infinite":                {" 4.000E+05", "4.000E+999", "expected a finite number"},
		"no number":               {" 4.000E+05", "          ", `found ""`},
		"missing line":            {" 3.000E+00 4.000E+05\n", "", "line 8: expected more lines, values among them, found the end of the file"},
		"line too many":           {" 3.000E+00 4.000E+05\n", " 3.000E+00 4.000E+05\n1\n", "expected 0 lines behind the matrix, found 1"},
	} {
		t.Run(name, func(t *testing.T) {
			text := strings.Replace(tight(), test.old, test.new, 1)
			if text == tight() {
				t.Fatal("the case changes nothing")
			}
			_, _, err := ReadMatrix(write(t, "a.rua", text), Options{})
			if err == nil || !strings.Contains(err.Error(), test.want) {
				t.Errorf("error is %v, want %q in it\n%s", err, test.want, text)
			}
		})
	}
}

func TestFortranFormats(t *testing.T) {
	for format, want := range map[string]int{
		"(16I5)": 16, "(1P,4D20.12)": 4, "(8E10.3)": 8, "(1P5E16.8)": 5, "(4(1X,E19.12))": 4, "(I8)": 1, "( 3 E 26.18 )": 3,
		"(2E25.16E3)": 2, "(-2P,F8.2)": 1, "(2(I3,F5.1))": 4, "(26F3.0)": 26,
		"": 0, "16I5": 0, "(16I5": 0, "(A80)": 0, "(I0)": 0, "(0I5)": 0, "(I)": 0, "(9999I5)": 0, "((((((I5))))))": 0, "(5(4)": 0, "(999(999I5))": 0, "(-3I5)": 0,
	} {
		if got := len(parseFortran(format)); got != want {
			t.Errorf("parseFortran(%q) gives %d fields, want %d", format, got, want)
		}
	}
}
