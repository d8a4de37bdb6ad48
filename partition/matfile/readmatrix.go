package matfile

import (
	"fmt"
	"io"
	"math"

	"rowstead/partition/csr"
)

// ReadMatrix reads the whole matrix at path. Duplicates are summed in file
// order, with the bits of csr.Triplets.Matrix; entries that sum to zero stay
// stored. Memory at its peak: about 2.3 times the matrix (28 bytes an entry and
// 8 a row).
func ReadMatrix(path string, o Options) (*csr.Matrix, Header, error) {
	r, err := Open(path, o)
	if err != nil {
		return nil, Header{}, err
	}
	defer r.Close()
	var parts []csr.Triplets
	var dst csr.Triplets
	entries := 0
	for {
		err := r.Next(&dst)
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, r.head, err
		}
		parts = append(parts, csr.Triplets{
			I: append(make([]int32, 0, len(dst.I)), dst.I...),
			J: append(make([]int32, 0, len(dst.J)), dst.J...),
			V: append(make([]float64, 0, len(dst.V)), dst.V...),
		})
		entries += len(dst.V)
	}
	if err := inProportion(r.head, entries); err != nil {
		return nil, r.head, err
	}
	m, overflow := assemble(r.head.Rows, r.head.Cols, parts, entries)
	if overflow > 0 {
		return nil, r.head, &FileError{Path: path, Row: overflow, Expected: "duplicates whose sum is finite", Found: "a sum beyond the range of numbers"}
	}
	return m, r.head, nil
}

// A matrix may have emptyRows rows and rowsPerEntry more an entry; beyond that
// the header is not believed, since the rows alone would take the memory.
const (
	emptyRows    = 1 << 22
	rowsPerEntry = 64
)

func inProportion(h Header, entries int) error {
	if h.Rows <= emptyRows+rowsPerEntry*entries {
		return nil
	}
	return &FileError{Path: h.Path, Expected: fmt.Sprintf("rows in proportion to %d entries", entries), Found: fmt.Sprintf("%d rows, nearly all empty", h.Rows)}
}

// assemble sorts the entries into rows by counting; parts are dropped as they
// are used up. overflow is the row, from one, of a sum of duplicates that is not
// finite; 0 where there is none.
func assemble(rows, cols int, parts []csr.Triplets, entries int) (m *csr.Matrix, overflow int) {
	m = &csr.Matrix{Rows: rows, Cols: cols, Start: make([]int, rows+1)}
	for _, t := range parts {
		for _, i := range t.I {
			m.Start[i+1]++
		}
	}
	for i := range rows {
		m.Start[i+1] += m.Start[i]
	}
	m.Col, m.Val = make([]int32, entries), make([]float64, entries)
	// Start[i] moves to the end of row i while it is filled.
	for p, t := range parts {
		for k, i := range t.I {
			at := m.Start[i]
			m.Col[at], m.Val[at] = t.J[k], t.V[k]
			m.Start[i] = at + 1
		}
		parts[p] = csr.Triplets{}
	}
	copy(m.Start[1:], m.Start[:rows])
	m.Start[0] = 0
	return m, sortRows(m)
}

// sortRows brings every row to ascending columns and sums duplicates in the
// order in which they stand. It returns what assemble calls overflow.
func sortRows(m *csr.Matrix) (overflow int) {
	i := 0
	for i < m.Rows && ascending(m.Col[m.Start[i]:m.Start[i+1]]) {
		i++
	}
	var spare rowSorter
	at := m.Start[i]
	for from := at; i < m.Rows; i++ {
		to := m.Start[i+1]
		c, v := m.Col[from:to], m.Val[from:to]
		from = to
		if !ascending(c) {
			spare.sort(c, v)
		}
		for k := range c {
			if k > 0 && c[k] == c[k-1] {
				if m.Val[at-1] += v[k]; overflow == 0 && !finite(m.Val[at-1]) {
					overflow = i + 1
				}
				continue
			}
			m.Col[at], m.Val[at] = c[k], v[k]
			at++
		}
		m.Start[i+1] = at
	}
	if at < len(m.Col) {
		m.Col, m.Val = m.Col[:at:at], m.Val[:at:at]
	}
	return overflow
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

func ascending(c []int32) bool {
	for k := 1; k < len(c); k++ {
		if c[k] <= c[k-1] {
			return false
		}
	}
	return true
}

// rowSorter sorts one row stably by column; it keeps its scratch memory.
type rowSorter struct {
	c []int32
	v []float64
}

const insertionLimit = 24 // below, insertion beats merging: common practice, no source

// sort is a merge sort from the bottom up over insertion-sorted runs.
func (s *rowSorter) sort(c []int32, v []float64) {
	for lo := 0; lo < len(c); lo += insertionLimit {
		insertionSort(c[lo:min(lo+insertionLimit, len(c))], v[lo:min(lo+insertionLimit, len(c))])
	}
	if len(c) <= insertionLimit {
		return
	}
	if cap(s.c) < len(c) {
		s.c, s.v = make([]int32, len(c)), make([]float64, len(c))
	}
	for run := insertionLimit; run < len(c); run *= 2 {
		for lo := 0; lo+run < len(c); lo += 2 * run {
			s.merge(c[lo:min(lo+2*run, len(c))], v[lo:min(lo+2*run, len(c))], run)
		}
	}
}

// merge joins the sorted c[:mid] and c[mid:], the left one first where equal.
func (s *rowSorter) merge(c []int32, v []float64, mid int) {
	if c[mid-1] <= c[mid] {
		return
	}
	left, leftV := s.c[:mid], s.v[:mid]
	copy(left, c)
	copy(leftV, v)
	for l, r, k := 0, mid, 0; l < mid; k++ {
		if r < len(c) && c[r] < left[l] {
			c[k], v[k] = c[r], v[r]
			r++
			continue
		}
		c[k], v[k] = left[l], leftV[l]
		l++
	}
}

func insertionSort(c []int32, v []float64) {
	for k := 1; k < len(c); k++ {
		ck, vk := c[k], v[k]
		p := k
		for ; p > 0 && c[p-1] > ck; p-- {
			c[p], v[p] = c[p-1], v[p-1]
		}
		c[p], v[p] = ck, vk
	}
}
