package matfile

import (
	"bytes"
	"fmt"
	"io"
	"strings"
)

// hbFile is the header of a Harwell-Boeing or Rutherford-Boeing file: four or
// five lines, then column pointers, row indices, values and right sides in
// Fortran formats. Sources: "Users' Guide for the Harwell-Boeing Sparse Matrix
// Collection" (1992), "The Rutherford-Boeing Sparse Matrix Collection" (1997),
// both from memory.
type hbFile struct {
	path     string
	head     Header
	rows     int // as the file states them
	cols     int
	lines    int // of the header
	cards    [5]int64
	pointers []fortranField
	indices  []fortranField
	values   []fortranField
	right    hbRight
}

// Positions in hbFile.cards: lines in all and of each part.
const (
	cardsTotal = iota
	cardsPointers
	cardsIndices
	cardsValues
	cardsRight
)

// hbRight describes the right sides.
type hbRight struct {
	kind    string // three letters: F or M, G when guesses follow, X when answers do
	columns int64
	entries int64 // of sparse right sides
	format  []fortranField
}

// looksBoeing tells a Boeing file by its third and fourth line.
func looksBoeing(start []byte) bool {
	lines := bytes.SplitN(start, []byte("\n"), 5)
	if len(lines) < 4 {
		return false
	}
	kind := bytes.ToUpper(bytes.TrimRight(lines[2], "\r"))
	return len(kind) > 3 && kind[3] == ' ' && bytes.IndexByte([]byte("RCPIQ"), kind[0]) >= 0 &&
		bytes.IndexByte([]byte("SUHZR"), kind[1]) >= 0 && bytes.IndexByte([]byte("AE"), kind[2]) >= 0 &&
		bytes.HasPrefix(bytes.TrimSpace(lines[3]), []byte("("))
}

// readHBHeader reads the header and checks that its counts agree.
func readHBHeader(in *stream) (*hbFile, error) {
	f := &hbFile{path: in.path, head: Header{Path: in.path, Format: "harwell-boeing", Layout: "csc", Compression: in.compression}}
	title, err := f.line(in)
	if err != nil {
		return nil, err
	}
	f.head.Title = titleOf(bytes.TrimSpace(title[:min(len(title), 72)]))
	for _, part := range []func([]byte) error{f.readCards, f.readKind, f.readFormats, f.readRight} {
		if f.lines == 4 && f.cards[cardsRight] == 0 {
			break
		}
		line, err := f.line(in)
		if err != nil {
			return nil, err
		}
		if err := part(line); err != nil {
			return nil, err
		}
	}
	return f, f.checkCards(in)
}

func (f *hbFile) line(in *stream) ([]byte, error) {
	line, err := in.readLine(f.lines + 1)
	if err == io.EOF {
		return nil, f.refuse("a header of four or five lines", "the end of the file")
	}
	f.lines++
	return line, err
}

func (f *hbFile) refuse(expected, found string) error {
	return &FileError{Path: f.path, Line: f.lines, Expected: expected, Found: found}
}

// fixed returns columns [from, to) of a line without blanks around.
func fixed(line []byte, from, to int) []byte {
	return fortranField{from: from, to: to}.cut(line)
}

// readCards reads how many lines each part has.
func (f *hbFile) readCards(line []byte) error {
	for k := range f.cards {
		word := fixed(line, 14*k, 14*k+14)
		if len(word) == 0 && k >= cardsValues {
			continue
		}
		n, ok := wholeNumber(word)
		if !ok {
			return f.refuse("counts of lines in columns of 14", quote(line))
		}
		f.cards[k] = n
	}
	return nil
}

// readKind reads the three letters of the type, rows, columns and entries.
func (f *hbFile) readKind(line []byte) error {
	kind := strings.ToUpper(string(line[:min(3, len(line))]))
	if len(kind) < 3 || kind[2] != 'A' {
		return f.refuse("an assembled matrix (third letter A)", quote(kind))
	}
	field, symmetry := map[byte]string{'R': "real", 'C': "complex", 'P': "pattern", 'I': "integer"}[kind[0]],
		map[byte]string{'U': "general", 'R': "general", 'S': "symmetric", 'H': "hermitian", 'Z': "skew-symmetric"}[kind[1]]
	if field == "" || symmetry == "" || symmetry == "hermitian" && field != "complex" || symmetry == "skew-symmetric" && field == "pattern" {
		return f.refuse("a type of R, C, P or I, then U, R, S, H or Z, then A", quote(kind))
	}
	var n [3]int64
	for k := range n {
		v, ok := wholeNumber(fixed(line, 14*k+14, 14*k+28))
		if !ok {
			return f.refuse("rows, columns and entries in columns of 14", quote(line))
		}
		n[k] = v
	}
	f.head.Field, f.head.Symmetry, f.head.Complex, f.head.Stored = field, symmetry, field == "complex", n[2]
	f.rows, f.cols = int(n[0]), int(n[1])
	return f.head.setShape(n[0], n[1], f.lines)
}

// readFormats reads the formats of pointers, indices, values and right sides.
func (f *hbFile) readFormats(line []byte) error {
	for _, part := range []struct {
		what     string
		from, to int
		integer  bool
		into     *[]fortranField
		needed   bool
	}{
		{"pointers", 0, 16, true, &f.pointers, true},
		{"indices", 16, 32, true, &f.indices, true},
		{"values", 32, 52, false, &f.values, f.head.Field != "pattern"},
		{"right sides", 52, 72, false, &f.right.format, f.cards[cardsRight] > 0},
	} {
		if !part.needed {
			continue
		}
		text := string(fixed(line, part.from, part.to))
		fields := parseFortran(text)
		for _, field := range fields {
			if part.integer && field.kind != 'I' {
				fields = nil
				break
			}
		}
		if len(fields) == 0 {
			return f.refuse("a Fortran format of the "+part.what+", such as (16I5) or (1P,4D20.12)", quote(text))
		}
		*part.into = fields
	}
	return nil
}

// readRight reads the kind and number of right sides.
func (f *hbFile) readRight(line []byte) error {
	padded := append([]byte(strings.ToUpper(string(line[:min(3, len(line))]))), "   "...)
	f.right.kind = string(padded[:3])
	columns, ok := wholeNumber(fixed(line, 14, 28))
	if !ok || columns < 1 || columns > 1<<20 || f.right.kind[0] != 'F' && f.right.kind[0] != 'M' {
		return f.refuse("F or M and a number of right sides", quote(line))
	}
	f.right.columns = columns
	if f.right.kind[0] == 'M' {
		if f.right.entries, ok = wholeNumber(fixed(line, 28, 42)); !ok {
			return f.refuse("the entries of the sparse right sides", quote(line))
		}
	}
	return nil
}

// checkCards compares the counts of lines with what the formats need.
func (f *hbFile) checkCards(in *stream) error {
	values := f.head.Stored
	switch f.head.Field {
	case "complex":
		values *= 2
	case "pattern":
		values = 0
	}
	for _, part := range []struct {
		what    string
		card    int
		numbers int64
		format  []fortranField
	}{
		{"pointers", cardsPointers, int64(f.cols) + 1, f.pointers},
		{"indices", cardsIndices, f.head.Stored, f.indices},
		{"values", cardsValues, values, f.values},
	} {
		if want := linesFor(part.numbers, part.format); want != f.cards[part.card] {
			return &FileError{Path: f.path, Line: 2, Expected: fmt.Sprintf("%d lines of %s, which %d numbers take", want, part.what, part.numbers), Found: fmt.Sprint(f.cards[part.card])}
		}
	}
	if in.size >= 0 && f.head.Stored > in.size {
		return &FileError{Path: f.path, Line: 3, Expected: countOf(f.head.Stored, "entry", "entries"), Found: "a file of " + countOf(in.size, "byte", "bytes")}
	}
	return nil
}

// linesFor is how many lines that many numbers take.
func linesFor(numbers int64, format []fortranField) int64 {
	if numbers == 0 || len(format) == 0 {
		return 0
	}
	return (numbers-1)/int64(len(format)) + 1
}
