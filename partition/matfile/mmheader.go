package matfile

import (
	"bytes"
	"fmt"
	"io"
	"strings"
)

const mmBanner = "%%MatrixMarket"

// mmFile is a Matrix Market file behind its size line.
type mmFile struct {
	in         *stream
	head       Header
	rows, cols int // as the file states them
	lines      int // lines read so far
}

// readMMHeader reads the banner, the comments and the size line.
func readMMHeader(in *stream) (*mmFile, error) {
	f := &mmFile{in: in, head: Header{Path: in.path, Format: "matrix market", Compression: in.compression}}
	line, err := f.line("the " + mmBanner + " line")
	if err != nil {
		return nil, err
	}
	if err := f.banner(string(line)); err != nil {
		return nil, err
	}
	for {
		line, err := f.line("the line with the sizes")
		if err != nil {
			return nil, err
		}
		text := bytes.TrimSpace(line)
		if len(text) > 0 && text[0] == '%' {
			if f.head.Title == "" {
				f.head.Title = titleOf(text)
			}
			continue
		}
		if len(text) > 0 {
			return f, f.sizes(text)
		}
	}
}

// titleOf is a comment without its marks, at most 200 bytes.
func titleOf(text []byte) string {
	text = bytes.TrimLeft(text, "%# \t")
	return strings.ToValidUTF8(string(text[:min(len(text), 200)]), "?")
}

func (f *mmFile) line(expected string) ([]byte, error) {
	line, err := f.in.readLine(f.lines + 1)
	if err == io.EOF {
		return nil, &FileError{Path: f.in.path, Line: f.lines, Expected: expected, Found: "the end of the file"}
	}
	f.lines++
	return line, err
}

func (f *mmFile) refuse(expected string, found []byte) error {
	return &FileError{Path: f.in.path, Line: f.lines, Expected: expected, Found: quote(found)}
}

// banner reads "%%MatrixMarket matrix layout field symmetry", in any case.
func (f *mmFile) banner(line string) error {
	words := strings.Fields(strings.ToLower(line))
	if len(words) != 5 {
		return f.refuse(mmBanner+" matrix, layout, field and symmetry", []byte(line))
	}
	layout, field, symmetry := words[2], words[3], words[4]
	switch field {
	case "double":
		field = "real"
	case "unsigned-integer":
		field = "integer"
	}
	for _, check := range []struct {
		word    string
		allowed []string
	}{
		{words[1], []string{"matrix"}},
		{layout, []string{"coordinate", "array"}},
		{field, []string{"real", "integer", "pattern", "complex"}},
		{symmetry, []string{"general", "symmetric", "skew-symmetric", "hermitian"}},
	} {
		if !contains(check.allowed, check.word) {
			return f.refuse(strings.Join(check.allowed, " or "), []byte(check.word))
		}
	}
	switch {
	case layout == "array" && field == "pattern":
		return f.refuse("real, integer or complex in an array file", []byte(field))
	case symmetry == "hermitian" && field != "complex":
		return f.refuse("complex in a hermitian file", []byte(field))
	case symmetry == "skew-symmetric" && field == "pattern":
		return f.refuse("values in a skew-symmetric file", []byte(field))
	}
	f.head.Layout, f.head.Field, f.head.Symmetry = layout, field, symmetry
	f.head.Complex, f.head.Dense = field == "complex", layout == "array"
	return nil
}

func contains(list []string, word string) bool {
	for _, w := range list {
		if w == word {
			return true
		}
	}
	return false
}

// sizes reads "rows columns [entries]" and refuses what cannot be.
func (f *mmFile) sizes(text []byte) error {
	want := "rows, columns and entries"
	count := 3
	if f.head.Dense {
		want, count = "rows and columns", 2
	}
	words := bytes.Fields(text)
	if len(words) != count {
		return f.refuse(want, text)
	}
	var n [3]int64
	for k, word := range words {
		v, ok := wholeNumber(word)
		if !ok {
			return f.refuse(want+faultOfCount(word), word)
		}
		n[k] = v
	}
	if err := f.head.setShape(n[0], n[1], f.lines); err != nil {
		return err
	}
	f.rows, f.cols = int(n[0]), int(n[1])
	f.head.Stored = n[2]
	if f.head.Dense {
		f.head.Stored = denseCount(f.rows, f.cols, f.head.Symmetry)
	}
	return f.checkPromise()
}

// checkPromise refuses a count that the bytes of a plain file cannot hold.
func (f *mmFile) checkPromise() error {
	least := int64(2) // a digit and a line end
	if !f.head.Dense {
		least = 4
	}
	if f.in.size >= 0 && f.head.Stored > f.in.size/least+1 {
		return &FileError{Path: f.in.path, Line: f.lines, Expected: countOf(f.head.Stored, "entry", "entries"), Found: "a file of " + countOf(f.in.size, "byte", "bytes")}
	}
	return nil
}

// denseCount is how many numbers an array file of that symmetry holds.
func denseCount(rows, cols int, symmetry string) int64 {
	n := int64(rows)
	switch symmetry {
	case "symmetric", "hermitian":
		return n * (n + 1) / 2
	case "skew-symmetric":
		return n * (n - 1) / 2
	}
	return n * int64(cols)
}

// faultOfCount says why a word is no count, where it is a whole number.
func faultOfCount(word []byte) string {
	digits := bytes.TrimLeft(word, "+-")
	if len(digits) == 0 || len(bytes.Trim(digits, "0123456789")) > 0 {
		return ""
	}
	if word[0] == '-' {
		return ", none of them negative"
	}
	if len(digits) > 18 {
		return ", none of them beyond 18 digits: this count is too large"
	}
	return ""
}

// countOf writes a count with its noun.
func countOf(n int64, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}

// wholeNumber reads an unsigned decimal number of at most 18 digits.
func wholeNumber(word []byte) (int64, bool) {
	if len(word) == 0 || len(word) > 18 {
		return 0, false
	}
	var n int64
	for _, c := range word {
		if c < '0' || c > '9' {
			return 0, false
		}
		n = n*10 + int64(c-'0')
	}
	return n, true
}
