package matfile

import (
	"fmt"

	"rowstead/partition/csr"
)

// expansionOf returns how the entries of a file become those of the real
// general matrix. vector leaves a complex entry a column of two numbers, as
// right sides want it, instead of a 2×2 block.
func expansionOf(symmetry string, isComplex, vector bool) expansion {
	single := putReal
	switch {
	case isComplex && vector:
		single = putPair
	case isComplex:
		single = putBlock
	}
	x := expansion{most: 1, put: single}
	if isComplex {
		x.most = 4
	}
	if symmetry == "general" {
		return x
	}
	x.most *= 2
	x.check = triangleCheck(symmetry)
	mirror := mirrorOf(symmetry)
	x.put = func(t *csr.Triplets, k int, e *entry) int {
		k = single(t, k, e)
		if e.i == e.j {
			return k
		}
		other := mirror(*e)
		return single(t, k, &other)
	}
	return x
}

// mirrorOf returns the map from the entry (i, j) to the entry (j, i).
func mirrorOf(symmetry string) func(entry) entry {
	re, im := 1.0, 1.0
	switch symmetry {
	case "skew-symmetric":
		re, im = -1, -1
	case "hermitian":
		im = -1
	}
	return func(e entry) entry { return entry{e.j, e.i, re * e.re, im * e.im} }
}

// triangleCheck refuses what a symmetric file must not store.
func triangleCheck(symmetry string) func(*coordinates, *entry) error {
	return func(g *coordinates, e *entry) error {
		bad := &FileError{Path: g.path, Row: int(e.i) + 1}
		at := fmt.Sprintf("row %d, column %d", int(e.i)+g.base, int(e.j)+g.base)
		switch {
		case e.i < e.j:
			bad.Expected, bad.Found = "only entries of the lower triangle (row ≥ column) in a "+symmetry+" file", at
		case e.i > e.j:
			return nil
		case symmetry == "skew-symmetric" && (e.re != 0 || e.im != 0):
			bad.Expected, bad.Found = "zero on the diagonal of a skew-symmetric file", at
		case symmetry == "hermitian" && e.im != 0:
			bad.Expected, bad.Found = "a real diagonal in a hermitian file", at
		default:
			return nil
		}
		return bad
	}
}

func putReal(t *csr.Triplets, k int, e *entry) int {
	t.I[k], t.J[k], t.V[k] = e.i, e.j, e.re
	return k + 1
}

// putPair stores a+bi as the column (a, b).
func putPair(t *csr.Triplets, k int, e *entry) int {
	i := 2 * e.i
	t.I[k], t.J[k], t.V[k] = i, e.j, e.re
	t.I[k+1], t.J[k+1], t.V[k+1] = i+1, e.j, e.im
	return k + 2
}

// putBlock stores a+bi as the block [a −b; b a].
func putBlock(t *csr.Triplets, k int, e *entry) int {
	i, j := 2*e.i, 2*e.j
	I, J, V := t.I[k:k+4], t.J[k:k+4], t.V[k:k+4]
	I[0], J[0], V[0] = i, j, e.re
	I[1], J[1], V[1] = i, j+1, 0-e.im
	I[2], J[2], V[2] = i+1, j, e.im
	I[3], J[3], V[3] = i+1, j+1, e.re
	return k + 4
}
