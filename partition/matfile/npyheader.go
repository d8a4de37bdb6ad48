package matfile

import (
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

const npyMagic = "\x93NUMPY"

// longestNpyHeader bounds what a header may make the reader hold; NumPy's own
// are below 200 bytes.
const longestNpyHeader = 64 << 10

// npyArray is what the header of a NumPy array says. Source: "A Simple File
// Format for NumPy Arrays", versions 1.0, 2.0 and 3.0.
type npyArray struct {
	kind    byte // 'f', 'i', 'u', 'b', 'c', 'S' or 'U'
	size    int  // bytes an element
	order   binary.ByteOrder
	fortran bool // column-major
	shape   []int64
}

// count is the number of elements; false where it cannot be.
func (a *npyArray) count() (int64, bool) {
	n := int64(1)
	for _, d := range a.shape {
		if d < 0 || d > 0 && n > math.MaxInt64/16/d {
			return 0, false
		}
		n *= d
	}
	return n, true
}

// readNpyHeader reads up to the first element; name stands for the file in
// errors.
func readNpyHeader(in io.Reader, name string) (*npyArray, error) {
	var start [8]byte
	if _, err := io.ReadFull(in, start[:]); err != nil || string(start[:6]) != npyMagic {
		return nil, &FileError{Path: name, Expected: "a NumPy array", Found: quote(start[:]), Err: truncation(err)}
	}
	width := 2
	switch start[6] {
	case 1:
	case 2, 3:
		width = 4
	default:
		return nil, &FileError{Path: name, Expected: "a NumPy array of version 1, 2 or 3", Found: fmt.Sprintf("version %d", start[6])}
	}
	var length [4]byte
	if _, err := io.ReadFull(in, length[:width]); err != nil {
		return nil, &FileError{Path: name, Expected: "a whole NumPy header", Found: "a truncated one", Err: truncation(err)}
	}
	n := binary.LittleEndian.Uint32(length[:])
	if n > longestNpyHeader {
		return nil, &FileError{Path: name, Expected: fmt.Sprintf("a NumPy header of at most %d bytes", longestNpyHeader), Found: fmt.Sprint(n)}
	}
	text := make([]byte, n)
	if _, err := io.ReadFull(in, text); err != nil {
		return nil, &FileError{Path: name, Expected: "a whole NumPy header", Found: "a truncated one", Err: truncation(err)}
	}
	a, err := parseNpyHeader(string(text))
	if err != nil {
		err.Path = name
		return nil, err
	}
	return a, nil
}

// truncation drops an end of file, which the message says already.
func truncation(err error) error {
	if err == io.EOF || err == io.ErrUnexpectedEOF {
		return nil
	}
	return err
}

// parseNpyHeader reads the dictionary {'descr': …, 'fortran_order': …, 'shape': …}.
func parseNpyHeader(text string) (*npyArray, *FileError) {
	a := &npyArray{}
	p := literal{text: text}
	seen := map[string]bool{}
	p.expect("{")
	for !p.accept("}") && !p.failed {
		key := p.word()
		p.expect(":")
		seen[key] = true
		switch key {
		case "descr":
			if bad := a.setType(p.word()); bad != nil && !p.failed {
				return nil, bad
			}
		case "fortran_order":
			a.fortran = p.accept("True")
			if !a.fortran {
				p.expect("False")
			}
		case "shape":
			a.shape = p.tuple()
		default:
			p.failed = true
		}
		if !p.accept(",") {
			p.expect("}")
			break
		}
	}
	if p.failed || !seen["descr"] || !seen["shape"] || !seen["fortran_order"] {
		return nil, &FileError{Expected: "a NumPy header with descr (a plain number type), fortran_order and shape", Found: quote(text)}
	}
	if _, ok := a.count(); !ok {
		return nil, &FileError{Expected: "a shape that fits a file", Found: quote(text)}
	}
	return a, nil
}

// setType reads a type such as "<f8".
func (a *npyArray) setType(descr string) *FileError {
	refused := &FileError{Expected: "numbers of type float32, float64, int, uint, bool or complex", Found: quote(descr)}
	if len(descr) < 3 {
		return refused
	}
	size, err := strconv.Atoi(descr[2:])
	if err != nil || size < 1 || size > 64 {
		return refused
	}
	a.kind, a.size, a.order = descr[1], size, binary.LittleEndian
	switch descr[0] {
	case '>':
		a.order = binary.BigEndian
	case '<', '|', '=':
	default:
		return refused
	}
	widths := map[byte]string{'f': "4 8", 'i': "1 2 4 8", 'u': "1 2 4 8", 'b': "1", 'c': "8 16"}[a.kind]
	if a.kind == 'U' {
		a.size *= 4
	}
	if a.kind != 'S' && a.kind != 'U' && !contains(strings.Fields(widths), strconv.Itoa(size)) {
		return refused
	}
	return nil
}

// literal reads the few Python literals a NumPy header holds.
type literal struct {
	text   string
	failed bool
}

func (p *literal) accept(token string) bool {
	p.text = strings.TrimLeft(p.text, " \t\n")
	rest, ok := strings.CutPrefix(p.text, token)
	if ok {
		p.text = rest
	}
	return ok
}

func (p *literal) expect(token string) {
	p.failed = !p.accept(token) || p.failed
}

// word reads a string in single or double quotes.
func (p *literal) word() string {
	mark := "'"
	if !p.accept(mark) {
		mark = `"`
		p.expect(mark)
	}
	word, rest, ok := strings.Cut(p.text, mark)
	p.failed = p.failed || !ok
	p.text = rest
	return word
}

// tuple reads whole numbers in parentheses.
func (p *literal) tuple() []int64 {
	var out []int64
	p.expect("(")
	for !p.accept(")") && !p.failed && len(out) < 32 {
		n := 0
		for n < len(p.text) && p.text[n] >= '0' && p.text[n] <= '9' {
			n++
		}
		v, ok := wholeNumber([]byte(p.text[:n]))
		p.failed = p.failed || !ok
		p.text = p.text[n:]
		p.accept("L") // as old versions wrote long numbers
		out = append(out, v)
		if !p.accept(",") {
			p.expect(")")
			break
		}
	}
	return out
}
