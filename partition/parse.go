package partition

import (
	"encoding/json"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// maxCutsText is the longest text of cuts that is read: room for a hundred
// thousand blocks, and a matrix given by mistake is refused at once.
const maxCutsText = 1 << 20

// ReadCuts is ParseCuts of all that r holds, at most 1 MiB.
func ReadCuts(r io.Reader, rows int) (RowCuts, error) {
	text, err := io.ReadAll(io.LimitReader(r, maxCutsText+1))
	if err != nil {
		return RowCuts{}, fmt.Errorf("cuts: %w", err)
	}
	if len(text) > maxCutsText {
		return RowCuts{}, fmt.Errorf("cuts: longer than %d bytes; want the first rows of the blocks", maxCutsText)
	}
	return ParseCuts(string(text), rows)
}

// ParseCuts reads the first rows of the blocks of a matrix with so many rows,
// counted from 0: whole numbers between white space, or one JSON list of them.
// The number of rows may stand at the end. Errors name the line or the block.
func ParseCuts(text string, rows int) (RowCuts, error) {
	starts, err := parseStarts(text)
	if err != nil {
		return RowCuts{}, err
	}
	return FromStarts(starts, rows)
}

func parseStarts(text string) ([]int, error) {
	if strings.HasPrefix(strings.TrimSpace(text), "[") {
		var starts []int
		if err := json.Unmarshal([]byte(text), &starts); err != nil {
			return nil, fmt.Errorf("cuts: want a list like [0, 4096, 8192]: %w", err)
		}
		return starts, nil
	}
	var starts []int
	line := 0
	for words := range strings.Lines(text) {
		line++
		for _, word := range strings.Fields(words) {
			row, err := strconv.Atoi(word)
			if err != nil {
				return nil, fmt.Errorf("cuts: line %d: %s; want the first row of a block, a whole number", line, shorten(word))
			}
			starts = append(starts, row)
		}
	}
	return starts, nil
}

// shorten quotes a word for a message, cut to a readable length.
func shorten(word string) string {
	const longest = 40
	if len(word) > longest {
		return strconv.Quote(word[:longest]) + "…"
	}
	return strconv.Quote(word)
}
