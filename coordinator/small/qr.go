package small

import "math"

const (
	blockStrips  = 4                   // strips whose reflectors share one T
	blockColumns = blockStrips * lanes // columns of a block and most of a piece
	// tileRows rows of four strips of V are 32 KiB: they stay in the first cache
	// while the strips of C pass by.
	tileRows = 128
)

// QR is the Householder factorisation A = Q·R of a matrix whose columns arrive
// in panels. Its bits depend on the panels; R agrees to rounding whatever they
// are.
//
// The reflectors stand in strips of eight columns, zeros above the diagonal and
// ones on it written out. Those of 32 columns act as one,
// H₁⋯H₃₂ = I − V·T·Vᵀ (Schreiber and Van Loan's compact WY form; Golub and Van
// Loan, Matrix Computations, 4th ed., section 5.1.7).
type QR struct {
	rows, capacity, columns int

	v    []float64 // strips, rows×8 each
	t    []float64 // −Tᵀ of each block, four strips of 32 rows
	sign []float64 // ±1: row i of R is sign[i] times what the reflectors leave
	r    []float64 // packed columns

	piece   []float64 // four strips of the columns in work
	scale   [blockColumns]float64
	product [blockStrips][blockStrips]square // Vᵀ·C by strips of C and of V
	turned  [blockStrips][blockStrips]square // Tᵀ·Vᵀ·C
	vector  []float64                        // of TransposeApply
}

// NewQR makes room for a factorisation of rows × capacity, capacity ≤ rows:
// rows·capacity + capacity²/2 + 33·rows doubles.
func NewQR(rows, capacity int) *QR {
	if rows < 1 || capacity < 1 || capacity > rows {
		panic("small: NewQR needs 1 ≤ capacity ≤ rows")
	}
	blocks := (capacity + blockColumns - 1) / blockColumns
	return &QR{
		rows: rows, capacity: capacity,
		v:      make([]float64, blocks*blockColumns*rows),
		t:      make([]float64, blocks*blockColumns*blockColumns),
		sign:   make([]float64, capacity),
		r:      make([]float64, capacity*(capacity+1)/2),
		piece:  make([]float64, blockColumns*rows),
		vector: make([]float64, rows),
	}
}

// Reset empties the factorisation and keeps its room. Triangles got from R
// before lose their meaning.
func (q *QR) Reset() { q.columns = 0 }

// Rows is the s of s×k.
func (q *QR) Rows() int { return q.rows }

// Columns is the number of columns appended since Reset.
func (q *QR) Columns() int { return q.columns }

// R is a view of the k×k factor, k = Columns, packed by columns, with a
// non-negative diagonal. It stays valid and unchanged through later Appends,
// until Reset.
func (q *QR) R() Triangle { return Triangle{q.r[:q.columns*(q.columns+1)/2], q.columns} }

// Append adds m = len(cols)/rows ≥ 1 columns, s×m column-major, which are copied.
//
// A column that depends on the earlier ones gives a diagonal entry of about
// ε·‖column‖, a zero column zeros; neither is an error. Entries that are not
// finite spread through R. Columns are scaled by powers of two where their
// squares could leave the range of doubles. Append panics when cols is not a
// whole number of columns or exceeds the capacity.
//
// 4·s·k flops a column, in panels of 8 and more as products of matrices.
func (q *QR) Append(cols []float64) {
	m := len(cols) / q.rows
	if m < 1 || m*q.rows != len(cols) {
		panic("small: Append needs whole columns")
	}
	if q.columns+m > q.capacity {
		panic("small: Append beyond the capacity of the QR")
	}
	for m > 0 {
		n := min(m, blockColumns)
		q.appendPiece(cols[:n*q.rows], n)
		cols, m = cols[n*q.rows:], m-n
	}
}

// appendPiece appends n ≤ 32 columns.
func (q *QR) appendPiece(cols []float64, n int) {
	for j := range n {
		q.scale[j] = q.load(j, cols[j*q.rows:(j+1)*q.rows])
	}
	strips := (n + lanes - 1) / lanes
	for j := n; j < strips*lanes; j++ {
		q.clear(j)
	}
	q.apply(strips, q.columns)
	for a := range strips {
		q.factorStrip(a, strips, min(lanes, n-a*lanes))
	}
}

// load copies a column to lane j of the piece and returns the power of two it
// was divided by: one, unless the squares could overflow or vanish.
func (q *QR) load(j int, column []float64) float64 {
	scale := powerOfTwo(largestOf(column))
	strip, lane := q.strip(j/lanes), j%lanes
	if scale == 1 {
		for i, a := range column {
			strip[i*lanes+lane] = a
		}
		return 1
	}
	_, e := math.Frexp(scale)
	for i, a := range column {
		strip[i*lanes+lane] = math.Ldexp(a, 1-e)
	}
	return scale
}

// powerOfTwo is the scale of a column with this largest entry. 2^±200 leaves
// room for sums of squares above and for residuals of 1e-60 below.
func powerOfTwo(largest float64) float64 {
	if largest == 0 || math.IsInf(largest, 0) || math.IsNaN(largest) ||
		(largest > 0x1p-200 && largest < 0x1p200) {
		return 1
	}
	_, e := math.Frexp(largest)
	return math.Ldexp(1, max(e-1, -1000)) // its inverse must be finite
}

// strip is strip a of the piece, strip a of the reflectors is reflectors(a).
func (q *QR) strip(a int) []float64 {
	n := lanes * q.rows
	return q.piece[a*n : (a+1)*n : (a+1)*n]
}

func (q *QR) reflectors(a int) []float64 {
	n := lanes * q.rows
	return q.v[a*n : (a+1)*n : (a+1)*n]
}

// clear sets lane j of the piece to zero.
func (q *QR) clear(j int) {
	strip := q.strip(j / lanes)
	for i := j % lanes; i < len(strip); i += lanes {
		strip[i] = 0
	}
}

// apply replaces the leading strips C of the piece by H_n⋯H₁·C, the first n
// reflectors, rounded up to whole blocks but never beyond columns.
func (q *QR) apply(strips, n int) {
	for b := 0; b*blockColumns < n; b++ {
		used := (min(q.columns-b*blockColumns, blockColumns) + lanes - 1) / lanes
		q.applyBlock(b, used, strips)
	}
}

// applyBlock replaces C by (I − V·Tᵀ·Vᵀ)·C for block b with used strips of V.
func (q *QR) applyBlock(b, used, strips int) {
	for a := range strips {
		clear(q.product[a][:used])
		clear(q.turned[a][:used])
	}
	first := b * blockColumns
	for lo := first; lo < q.rows; lo += tileRows {
		hi := min(lo+tileRows, q.rows)
		for a := range strips {
			c := q.strip(a)[lo*lanes : hi*lanes]
			for j := range used {
				gram(&q.product[a][j], q.reflectors(b*blockStrips + j)[lo*lanes:hi*lanes], c)
			}
		}
	}
	for a := range strips {
		q.turn(b, used, a)
	}
	for lo := first; lo < q.rows; lo += tileRows {
		hi := min(lo+tileRows, q.rows)
		for a := range strips {
			c := q.strip(a)[lo*lanes : hi*lanes]
			for j := range used {
				update(c, q.reflectors(b*blockStrips + j)[lo*lanes:hi*lanes], &q.turned[a][j])
			}
		}
	}
}

// turn forms Tᵀ·(Vᵀ·C) for strip a of C. Tᵀ is lower triangular.
func (q *QR) turn(b, used, a int) {
	for j := range used {
		t := q.blockT(b, j)
		for i := j; i < used; i++ {
			update(q.turned[a][i][:], t[i*lanes*lanes:(i+1)*lanes*lanes], &q.product[a][j])
		}
	}
}

// blockT is strip j of the −Tᵀ of block b, 32 rows.
func (q *QR) blockT(b, j int) []float64 {
	const n = blockColumns * lanes
	at := (b*blockStrips + j) * n
	return q.t[at : at+n : at+n]
}

// TransposeApply sets out to the leading len(out) ≤ Columns entries of Qᵀ·v.
//
//	v    length s, untouched
//
// 4·s·len(out) flops; the reflectors pass through memory once.
func (q *QR) TransposeApply(v, out []float64) {
	if len(v) != q.rows || len(out) > q.columns {
		panic("small: TransposeApply needs len(v) = rows and len(out) ≤ columns")
	}
	x := q.vector
	copy(x, v)
	for b := 0; b*blockColumns < len(out); b++ {
		q.applyToVector(x, b)
	}
	for i := range out {
		out[i] = q.sign[i] * x[i]
	}
}

// applyToVector is applyBlock for one vector, with the same bits.
func (q *QR) applyToVector(x []float64, b int) {
	first := b * blockColumns
	used := (min(q.columns-first, blockColumns) + lanes - 1) / lanes
	var product, turned [blockColumns]float64
	for j := range used {
		w := (*[lanes]float64)(product[j*lanes:])
		vectorGram(w, q.reflectors(b*blockStrips + j)[first*lanes:], x[first:])
	}
	for j := range used {
		w := (*[lanes]float64)(product[j*lanes:])
		vectorUpdate(turned[j*lanes:used*lanes], q.blockT(b, j)[j*lanes*lanes:], w)
	}
	for j := range used {
		w := (*[lanes]float64)(turned[j*lanes:])
		vectorUpdate(x[first:], q.reflectors(b*blockStrips + j)[first*lanes:], w)
	}
}

// transposeApplyAll replaces every column of a, s×m column-major, by H_k⋯H₁
// times it, with the signs of R's rows: Qᵀ·a in the leading k rows and the
// coordinates of what lies outside span Q beneath.
func (q *QR) transposeApplyAll(a []float64) {
	for len(a) > 0 {
		n := min(len(a)/q.rows, blockColumns)
		for j := range n {
			q.scale[j] = q.load(j, a[j*q.rows:(j+1)*q.rows])
		}
		strips := (n + lanes - 1) / lanes
		for j := n; j < strips*lanes; j++ {
			q.clear(j)
		}
		q.apply(strips, q.columns)
		for j := range n {
			q.unload(j, a[j*q.rows:(j+1)*q.rows])
		}
		a = a[n*q.rows:]
	}
}

// unload copies lane j of the piece out, scaled back and with the signs of R.
func (q *QR) unload(j int, column []float64) {
	strip, lane := q.strip(j/lanes), j%lanes
	for i := range column {
		column[i] = strip[i*lanes+lane] * q.scale[j]
		if i < q.columns {
			column[i] *= q.sign[i]
		}
	}
}
