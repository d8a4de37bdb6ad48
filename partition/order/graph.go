// Package order finds better orders and scales for a sparse matrix before it
// is cut and solved, and says what is odd about it: reverse Cuthill-McKee,
// scaling by powers of two, symmetry, weak diagonals, empty rows.
//
// A permutation perm is a list of old rows in their new order: new row i is old
// row perm[i]. A scale is a list of exponents e: row i is multiplied by 2^e[i],
// so that nothing is rounded and everything can be undone. Rows and columns
// count from zero. The package makes new matrices and changes none that it is
// given, does no I/O, starts no goroutine, and gives the same answer on every
// machine.
package order

import (
	"math"

	"rowstead/partition/csr"
)

// graph is the pattern of A + Aᵀ: neighbours of i are adj[start[i]:start[i+1]],
// ascending; i itself may be among them and is passed over.
type graph struct {
	start  []int
	adj    []int32
	degree []int32 // neighbours beside i itself
}

// newGraph aliases the pattern of m where that is symmetric, else it merges it
// with that of Aᵀ. O(entries).
func newGraph(m *csr.Matrix) *graph {
	square(m)
	g := &graph{start: m.Start, adj: m.Col}
	if !symmetricPattern(m) {
		g.start, g.adj = merged(m)
	}
	g.degree = make([]int32, m.Rows)
	for i := range g.degree {
		near := g.near(int32(i))
		g.degree[i] = int32(len(near))
		for _, j := range near {
			if int(j) == i {
				g.degree[i]--
			}
		}
	}
	return g
}

func (g *graph) near(i int32) []int32 { return g.adj[g.start[i]:g.start[i+1]] }

func square(m *csr.Matrix) {
	if m.Rows != m.Cols {
		panic("order: the matrix is not square")
	}
}

// symmetricPattern walks Aᵀ without forming it: with rows taken in order, row c
// of Aᵀ appears column by column, and must match row c of A entry by entry.
func symmetricPattern(m *csr.Matrix) bool {
	next := append([]int(nil), m.Start[:m.Rows]...)
	for i := range m.Rows {
		for _, c := range m.Col[m.Start[i]:m.Start[i+1]] {
			k := next[c]
			if k == m.Start[c+1] || int(m.Col[k]) != i {
				return false
			}
			next[c]++
		}
	}
	return true
}

// merged returns the pattern of A + Aᵀ.
func merged(m *csr.Matrix) (start []int, adj []int32) {
	tStart, t := transposed(m)
	start = make([]int, m.Rows+1)
	adj = make([]int32, 0, len(m.Col)+len(m.Col)/2)
	for i := range m.Rows {
		a, b := m.Col[m.Start[i]:m.Start[i+1]], t[tStart[i]:tStart[i+1]]
		for len(a) > 0 || len(b) > 0 {
			next := int32(math.MaxInt32)
			if len(a) > 0 {
				next = a[0]
			}
			if len(b) > 0 {
				next = min(next, b[0])
			}
			if len(a) > 0 && a[0] == next {
				a = a[1:]
			}
			if len(b) > 0 && b[0] == next {
				b = b[1:]
			}
			adj = append(adj, next)
		}
		start[i+1] = len(adj)
	}
	return start, adj
}

// transposed returns the pattern of Aᵀ.
func transposed(m *csr.Matrix) (start []int, col []int32) {
	start, col = make([]int, m.Cols+1), make([]int32, len(m.Col))
	for _, c := range m.Col {
		start[c+1]++
	}
	for i := range m.Cols {
		start[i+1] += start[i]
	}
	next := append([]int(nil), start[:m.Cols]...)
	for i := range m.Rows {
		for _, c := range m.Col[m.Start[i]:m.Start[i+1]] {
			col[next[c]] = int32(i)
			next[c]++
		}
	}
	return start, col
}
