package kernel

// Combine adds to every column c of dst the combination Σ_j t[c·ldt+j]·cols[j]
// over r, term after term in the order of j.
//
//	dst   d columns, all local rows each
//	cols  k columns
//	t     k×d, column-major, ldt ≥ k
//
// It has the bits of Correct on each column of dst, but reads the basis once:
// four columns of a tile stay in the first cache while they go into every
// combination. 2·k·d multiplications and additions a row. (A dense block kernel
// with results held in registers was tried and came out no faster.)
func Combine[F Element](dst [][]float64, cols [][]F, t []float64, ldt int, r Range) {
	if len(dst) > 0 && (ldt < len(cols) || len(t) < (len(dst)-1)*ldt+len(cols)) {
		panic("kernel: coefficients and columns differ in number in Combine")
	}
	for r.Lo < r.Hi {
		p := r.next(Tile)
		for j := 0; j < len(cols); j += 4 {
			some := cols[j:min(j+4, len(cols))]
			for c, d := range dst {
				at := c*ldt + j
				Correct(d, some, t[at:at+len(some)], p)
			}
		}
	}
}
