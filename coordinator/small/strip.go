package small

import "math"

// load copies a column, divided by a power of two, to lane j of the piece.
func (q *QR) load(j int, column []float64, scale float64) {
	strip, lane := q.strip(j/lanes), j%lanes
	if scale == 1 {
		for i, a := range column {
			strip[i*lanes+lane] = a
		}
		return
	}
	_, e := math.Frexp(scale)
	for i, a := range column {
		strip[i*lanes+lane] = math.Ldexp(a, 1-e)
	}
}

// powerOfTwo is the scale of a column with this largest entry: one, unless the
// squares could overflow or vanish. 2^±200 leaves room for sums of squares above
// and for residuals of 1e-60 below.
func powerOfTwo(largest float64) float64 {
	if largest == 0 || math.IsInf(largest, 0) || math.IsNaN(largest) ||
		(largest > 0x1p-200 && largest < 0x1p200) {
		return 1
	}
	_, e := math.Frexp(largest)
	return math.Ldexp(1, max(e-1, -1000)) // its inverse must be finite
}

// strip is strip a of the piece.
func (q *QR) strip(a int) []float64 {
	n := lanes * q.rows
	return q.piece[a*n : (a+1)*n : (a+1)*n]
}

// reflectors is strip a of the reflectors: columns 8a … 8a+7.
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
