package matfile

import (
	"errors"
	"fmt"
	"strconv"
	"strings"
)

// ErrExists is what a writer returns, wrapped, when the file is there already
// and overwriting was not asked for.
var ErrExists = errors.New("the file exists already")

// FileError says what is wrong with a file and where.
type FileError struct {
	Path     string
	Line     int    // one-based line of the (inflated) text; 0 where there are no lines
	Row      int    // one-based row of the matrix; 0 where it is not about a row
	Expected string // what should stand there
	Found    string // what stands there, quoted where it is the file's own text
	Flag     string // the flag that accepts it; empty where there is none
	Err      error  // cause from below, if any
}

// Error is one line: file, line, row, what was expected, what was found, the flag.
func (e *FileError) Error() string {
	var s strings.Builder
	s.WriteString(e.Path)
	if e.Line > 0 {
		fmt.Fprintf(&s, ", line %d", e.Line)
	}
	if e.Row > 0 {
		fmt.Fprintf(&s, ", row %d", e.Row)
	}
	s.WriteString(": expected ")
	s.WriteString(e.Expected)
	if e.Found != "" {
		s.WriteString(", found ")
		s.WriteString(e.Found)
	}
	if e.Err != nil {
		fmt.Fprintf(&s, " (%v)", e.Err)
	}
	if e.Flag != "" {
		s.WriteString("; accepted with ")
		s.WriteString(e.Flag)
	}
	return s.String()
}

func (e *FileError) Unwrap() error { return e.Err }

// quote shows a piece of the file in an error: printable, at most 40 bytes.
func quote[T string | []byte](text T) string {
	if len(text) > 40 {
		return strconv.QuoteToASCII(string(text[:40])) + "..."
	}
	return strconv.QuoteToASCII(string(text))
}
