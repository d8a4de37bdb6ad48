package main

import (
	"fmt"
	"io"
	"os"
	"strings"
	"sync"
	"time"

	"golang.org/x/term"
)

// How often progress is told: redrawn on a terminal, as a line elsewhere.
const (
	redrawEvery = 200 * time.Millisecond
	lineEvery   = 10 * time.Second
)

// screen is the progress line on standard error. It is safe for several
// goroutines.
type screen struct {
	w io.Writer

	mu    sync.Mutex
	last  time.Time // of the last sentence, guarded by mu
	drawn int       // characters that stand on the terminal's line, guarded by mu
}

// tell shows a sentence if it is time for one.
func (s *screen) tell(sentence string, now time.Time) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.last.IsZero() {
		s.last = now // a run shorter than one pause says nothing
	}
	width, terminal := s.terminal()
	if !terminal {
		if now.Sub(s.last) >= lineEvery {
			s.last = now
			fmt.Fprintln(s.w, sentence)
		}
		return
	}
	if now.Sub(s.last) < redrawEvery {
		return
	}
	s.last = now
	text := []rune(sentence)
	text = text[:min(len(text), max(width-1, 1))]
	blank := max(0, s.drawn-len(text))
	fmt.Fprintf(s.w, "\r%s%s", string(text), strings.Repeat(" ", blank))
	s.drawn = len(text)
}

// clear removes the sentence from the terminal's line.
func (s *screen) clear() {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.drawn > 0 {
		fmt.Fprintf(s.w, "\r%s\r", strings.Repeat(" ", s.drawn))
		s.drawn = 0
	}
}

// terminal is the width of the terminal that s writes to, if it is one.
func (s *screen) terminal() (width int, is bool) {
	f, file := s.w.(*os.File)
	if !file || !term.IsTerminal(int(f.Fd())) {
		return 0, false
	}
	width, _, err := term.GetSize(int(f.Fd()))
	if err != nil || width <= 0 {
		width = 80
	}
	return width, true
}
