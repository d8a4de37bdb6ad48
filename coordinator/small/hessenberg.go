package small

import "math"

// Hessenberg is the projected problem of one cycle, min over y of ‖g − M·y‖₂.
//
// M has d recycled columns that are already triangular, the leading block of R
// of [S·C·U, S·b₀, …], and then one column R·H[:, j] a step, reaching one row
// further: entry d+j+1 is its last. g = beta·R[:, d]. Givens rotations keep
// Ω·M = [G; 0] with G triangular; Saad, Iterative Methods for Sparse Linear
// Systems, 2nd ed., section 6.5.3.
type Hessenberg struct {
	capacity, recycled, columns int

	packed   []float64 // G by columns
	cos, sin []float64 // of rotation i, rows recycled+i and recycled+i+1
	g        []float64 // Ω·g
	column   []float64
}

// NewHessenberg makes room for capacity columns, recycled ones included.
func NewHessenberg(capacity int) *Hessenberg {
	return &Hessenberg{
		capacity: capacity,
		packed:   make([]float64, capacity*(capacity+1)/2),
		cos:      make([]float64, capacity),
		sin:      make([]float64, capacity),
		g:        make([]float64, capacity+1),
		column:   make([]float64, capacity+1),
	}
}

// Reset begins a cycle: the d leading columns of r are those of S·C·U and column
// d is that of S·b₀, whose multiple by beta is the right side. Both are copied.
func (h *Hessenberg) Reset(r Triangle, recycled int, beta float64) {
	if recycled >= r.Size() || recycled > h.capacity {
		panic("small: Hessenberg.Reset needs the column of b₀ and room for the recycled ones")
	}
	h.recycled, h.columns = recycled, recycled
	copy(h.packed, r.packed[:recycled*(recycled+1)/2])
	clear(h.g)
	for i, a := range r.Column(recycled) {
		h.g[i] = beta * a
	}
}

// Columns is the number of columns of M, recycled ones included.
func (h *Hessenberg) Columns() int { return h.columns }

// Recycled is d.
func (h *Hessenberg) Recycled() int { return h.recycled }

// Triangle is the view of G; it stays valid until Reset.
func (h *Hessenberg) Triangle() Triangle {
	return Triangle{h.packed[:h.columns*(h.columns+1)/2], h.columns}
}

// RightSide is a copy of the leading Columns entries of Ω·g, the right side that
// belongs to Triangle.
func (h *Hessenberg) RightSide() []float64 { return append([]float64(nil), h.g[:h.columns]...) }

// Append adds a column of R·H, which is copied: length Columns()+2, or
// Columns()+1 when the step broke down and its last entry is zero.
func (h *Hessenberg) Append(col []float64) {
	m := h.columns
	if len(col) != m+1 && len(col) != m+2 {
		panic("small: Hessenberg.Append needs Columns()+2 entries, or +1 at a breakdown")
	}
	if m == h.capacity {
		panic("small: Hessenberg.Append beyond the capacity")
	}
	c := h.column[:m+2]
	c[m+1] = 0
	copy(c, col)
	h.rotate(c, m)
	cos, sin, diagonal := givens(c[m], c[m+1])
	h.cos[m-h.recycled], h.sin[m-h.recycled] = cos, sin
	c[m] = diagonal
	copy(h.packed[m*(m+1)/2:], c[:m+1])
	h.g[m], h.g[m+1] = float64(cos*h.g[m])+float64(sin*h.g[m+1]), float64(cos*h.g[m+1])-float64(sin*h.g[m])
	h.columns++
}

// rotate applies the rotations whose first row is below m to c.
func (h *Hessenberg) rotate(c []float64, m int) {
	for i := h.recycled; i < m; i++ {
		cos, sin := h.cos[i-h.recycled], h.sin[i-h.recycled]
		c[i], c[i+1] = float64(cos*c[i])+float64(sin*c[i+1]), float64(cos*c[i+1])-float64(sin*c[i])
	}
}

// givens returns the rotation that turns (a, b) into (r, 0), r ≥ 0.
func givens(a, b float64) (cos, sin, r float64) {
	r = math.Hypot(a, b)
	if r == 0 {
		return 1, 0, 0
	}
	return a / r, b / r, r
}

// Estimate is min‖g − M·y‖₂ over all columns so far, in the units of beta. It
// is a sketched norm, not the true one.
func (h *Hessenberg) Estimate() float64 { return math.Abs(h.g[h.columns]) }

// diagonalFloor is the ratio of the smallest to the largest diagonal entry of G
// below which back substitution is not to be trusted; rankFloor the relative
// size of what the fallback drops. Both as tried out on the matrices of the
// suite: columns of S·B are sums of sketched numbers, good to about 1e-15.
const (
	diagonalFloor = 1e-15
	rankFloor     = 1e-14
)

// Solve sets y to the minimiser over the leading len(y) ≤ Columns columns, the
// d recycled ones first. When the diagonal of G is tiny somewhere, it is the
// minimum-norm solution of a rank-revealing factorisation, which takes O(k³)
// and allocates; direct tells which.
func (h *Hessenberg) Solve(y []float64) (direct bool) {
	n := len(y)
	if n > h.columns {
		panic("small: Hessenberg.Solve of more columns than there are")
	}
	t := h.Triangle().Leading(n)
	if smallest, largest := t.diagonalRange(); smallest > diagonalFloor*largest {
		copy(y, h.g[:n])
		t.Solve(y)
		return true
	}
	full := make([]float64, n*n)
	for j := range n {
		copy(full[j*n:], t.Column(j))
	}
	solution, _, _ := LeastSquaresTo(rankFloor, full, append([]float64(nil), h.g[:n]...), n, n)
	copy(y, solution)
	return false
}

// diagonalRange is the smallest and the largest |R_jj|; 1, 1 for an empty one.
func (t Triangle) diagonalRange() (smallest, largest float64) {
	if t.n == 0 {
		return 1, 1
	}
	smallest = math.Inf(1)
	for j := range t.n {
		a := math.Abs(t.At(j, j))
		smallest, largest = min(smallest, a), max(largest, a)
	}
	return smallest, largest
}
