package csr

// Triplets are entries (I[k], J[k], V[k]) in any order; equal positions are
// summed in the order in which they stand. The three slices have one length.
type Triplets struct {
	I, J []int32
	V    []float64
}

// Add appends one entry.
func (t *Triplets) Add(i, j int, v float64) {
	t.I, t.J, t.V = append(t.I, int32(i)), append(t.J, int32(j)), append(t.V, v)
}

// Matrix returns the rows×cols matrix of the entries. It panics when an index
// lies outside. Entries that sum to zero stay stored. O(rows + cols + entries):
// two stable counting sorts, by column and then by row.
func (t *Triplets) Matrix(rows, cols int) *Matrix {
	if len(t.I) != len(t.J) || len(t.I) != len(t.V) {
		panic("csr: triplet slices of different lengths")
	}
	byCol := stableOrder(t.J, cols, nil)
	order := stableOrder(t.I, rows, byCol)
	m := &Matrix{Rows: rows, Cols: cols, Start: make([]int, rows+1), Col: make([]int32, 0, len(order)), Val: make([]float64, 0, len(order))}
	row, last := 0, int32(-1)
	for _, k := range order {
		for ; row < int(t.I[k]); row++ {
			m.Start[row+1], last = len(m.Col), -1
		}
		if t.J[k] == last {
			m.Val[len(m.Val)-1] += t.V[k]
			continue
		}
		last = t.J[k]
		m.Col, m.Val = append(m.Col, last), append(m.Val, t.V[k])
	}
	for ; row < rows; row++ {
		m.Start[row+1] = len(m.Col)
	}
	return m
}

// stableOrder returns the positions of key sorted stably by value, beginning
// from the order given in before (nil: as they stand). Values lie in [0, n).
func stableOrder(key []int32, n int, before []int) []int {
	start := make([]int, n+1)
	for _, k := range key {
		start[k+1]++
	}
	for i := range n {
		start[i+1] += start[i]
	}
	out := make([]int, len(key))
	for p := range key {
		k := p
		if before != nil {
			k = before[p]
		}
		out[start[key[k]]] = k
		start[key[k]]++
	}
	return out
}
