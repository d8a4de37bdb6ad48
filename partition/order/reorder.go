package order

import (
	"slices"

	"rowstead/partition/csr"
)

// worthwhile is the part of the halo that a reordering may leave at most. Cut
// along diagonals instead of lines, four blocks of a square grid have 0.8 of
// the halo; that is not worth leaving the user's order for.
const worthwhile = 0.75

// Spread is how far a matrix reaches from its diagonal and its row blocks from
// their own rows.
type Spread struct {
	Bandwidth int   // largest |i − j| of an entry
	Profile   int64 // Σ over rows i of i − (first column of row i of A + Aᵀ, or i)
	Halo      int   // halo entries of all row blocks
}

// Cut returns where blocks begin in a matrix with these row starts: ascending
// from 0, with the number of rows at the end. It may give fewer blocks.
type Cut func(start []int, blocks int) []int

// Reorder returns the reverse Cuthill-McKee permutation if that takes at least
// a quarter off the halo of so many row blocks, else nil; and how m spreads
// before and after (the same when perm is nil).
//
//	m       square
//	blocks  for one block there is no halo, and perm is nil
//	cut     places the blocks, before and after; asked once for each
//
// Deterministic. Time is that of CuthillMcKee and a few passes over the entries.
func Reorder(m *csr.Matrix, blocks int, cut Cut) (perm []int32, before, after Spread) {
	square(m)
	before = spread(m, nil, nil, cut(m.Start, blocks))
	if before.Halo == 0 {
		return nil, before, before
	}
	perm = CuthillMcKee(m)
	start := make([]int, m.Rows+1)
	for i, old := range perm {
		start[i+1] = start[i] + m.Start[old+1] - m.Start[old]
	}
	after = spread(m, perm, Inverse(perm), cut(start, blocks))
	if float64(after.Halo) > worthwhile*float64(before.Halo) {
		return nil, before, before
	}
	return perm, before, after
}

// SpreadOf measures m as it stands. first as Cut returns it.
func SpreadOf(m *csr.Matrix, first []int) Spread {
	square(m)
	return spread(m, nil, nil, first)
}

// spread measures P·A·Pᵀ without forming it; nil stands for the identity.
func spread(m *csr.Matrix, perm, inverse []int32, first []int) Spread {
	var s Spread
	lowest := make([]int32, m.Rows)
	for i := range lowest {
		lowest[i] = int32(i)
	}
	seen := slices.Repeat([]int32{-1}, m.Rows) // by column: the last block that counted it
	for p := range len(first) - 1 {
		for i := first[p]; i < first[p+1]; i++ {
			old := i
			if perm != nil {
				old = int(perm[i])
			}
			for _, c := range m.Col[m.Start[old]:m.Start[old+1]] {
				if inverse != nil {
					c = inverse[c]
				}
				j := int(c)
				near, far := min(i, j), max(i, j)
				s.Bandwidth = max(s.Bandwidth, far-near)
				lowest[far] = min(lowest[far], int32(near))
				if (j < first[p] || j >= first[p+1]) && seen[j] != int32(p) {
					seen[j] = int32(p)
					s.Halo++
				}
			}
		}
	}
	for i, j := range lowest {
		s.Profile += int64(i) - int64(j)
	}
	return s
}
