package small

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
	vector  []float64                        // of applySingle
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
		column := cols[j*q.rows : (j+1)*q.rows]
		q.scale[j] = powerOfTwo(largestOf(column))
		q.load(j, column, q.scale[j])
	}
	strips := (n + lanes - 1) / lanes
	if n == 1 {
		q.applySingle(q.columns)
	} else {
		for j := n; j < strips*lanes; j++ {
			q.clear(j)
		}
		q.apply(strips, q.columns)
	}
	for a := range strips {
		q.factorStrip(a, strips, min(lanes, n-a*lanes))
	}
}
