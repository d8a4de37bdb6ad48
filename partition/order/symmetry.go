package order

import (
	"math"

	"rowstead/partition/csr"
)

// roundedGap is how far apart a_ij and a_ji may be, against the smaller of the
// largest entries of rows i and j, to be equal but for the order in which their
// parts were summed: a few units of rounding.
const roundedGap = 16 * 0x1p-52

// Symmetry says how near A is to Aᵀ.
type Symmetry struct {
	Pattern bool    // every stored entry has a stored partner
	Exact   bool    // a_ij = a_ji throughout; a missing partner counts as 0
	Rounded bool    // Gap is at the level of rounding
	Gap     float64 // largest |a_ij − a_ji| / min(max|row i|, max|row j|)
	Row     int     // where that is; −1 if Gap = 0
	Column  int
}

// SymmetryOf compares every entry with its partner. m is square. O(entries),
// 16 bytes a row.
func SymmetryOf(m *csr.Matrix) Symmetry {
	square(m)
	s := Symmetry{Pattern: true, Exact: true, Row: -1, Column: -1}
	largest := RowMax(m)
	next := append([]int(nil), m.Start[:m.Rows]...) // by row c: where its column i would stand
	for i := range m.Rows {
		cols, vals := m.Row(i)
		for k, c := range cols {
			for next[c] < m.Start[c+1] && int(m.Col[next[c]]) < i {
				next[c]++
			}
			partner := 0.0
			if at := next[c]; at < m.Start[c+1] && int(m.Col[at]) == i {
				partner = m.Val[at]
			} else {
				s.Pattern = false
			}
			if vals[k] != partner {
				s.Exact = false
				s.widen(i, int(c), gap(vals[k], partner, min(largest[i], largest[c])))
			}
		}
	}
	s.Rounded = s.Gap <= roundedGap
	return s
}

// gap returns |v − w|/scale without overflow, infinite where one of the rows
// holds nothing but zeros.
func gap(v, w, scale float64) float64 {
	if scale == 0 {
		return math.Inf(1)
	}
	return 2 * (math.Abs(v/2-w/2) / scale)
}

func (s *Symmetry) widen(i, j int, gap float64) {
	if gap > s.Gap {
		s.Gap, s.Row, s.Column = gap, i, j
	}
}
