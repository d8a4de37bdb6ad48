package small

import "math"

// factorStrip makes the reflectors of the n ≤ 8 columns in strip a of the
// piece, appends them with their columns of R, and applies them to the strips
// behind it.
func (q *QR) factorStrip(a, strips, n int) {
	base, strip := q.columns, q.strip(a)
	var tau [lanes]float64
	for c := range n {
		tau[c] = q.reflect(strip, base+c, c)
	}
	for c := range n {
		q.storeR(strip, base+c, c, q.scale[a*lanes+c])
		unit(strip, base+c, c)
	}
	q.columns += n
	q.storeReflectors(strip, base, n)
	for b := base / blockColumns; b*blockColumns < base+n; b++ {
		q.extendT(b, strip, base, tau[:n])
	}
	if a+1 < strips {
		q.applyStrip(a, strips, base, tau)
	}
}

// reflect makes the H = I − tau·v·vᵀ that turns column c of the strip, from the
// row of its pivot on, to (beta, 0, …, 0), and applies it to the columns behind
// it. v replaces the column beneath the pivot, v at the pivot is one. One pass
// gives the norm and all products, a second one updates.
func (q *QR) reflect(strip []float64, pivot, c int) (tau float64) {
	head := (*[lanes]float64)(strip[pivot*lanes:])
	below := strip[(pivot+1)*lanes:]
	var w [lanes]float64
	rowDots(&w, below, c)
	alpha, squares := head[c], w[c]
	q.sign[pivot] = 1
	if squares == 0 {
		if alpha < 0 {
			q.sign[pivot] = -1
		}
		return 0
	}
	// beta has the sign opposite to alpha: alpha − beta cannot cancel.
	beta := math.Sqrt(float64(alpha*alpha) + squares)
	if alpha >= 0 {
		beta = -beta
		q.sign[pivot] = -1
	}
	tau, scale := (beta-alpha)/beta, 1/(alpha-beta)
	for k := range w {
		if k <= c {
			w[k] = 0
			continue
		}
		w[k] = float64(tau * (head[k] + float64(scale*w[k])))
		head[k] -= w[k]
	}
	head[c] = beta
	rowUpdate(below, c, scale, &w)
	return tau
}

// storeR copies column c of the strip, down to its pivot, to column pivot of R.
func (q *QR) storeR(strip []float64, pivot, c int, scale float64) {
	at := pivot * (pivot + 1) / 2
	column := q.r[at : at+pivot+1]
	for i := range column {
		column[i] = q.sign[i] * strip[i*lanes+c] * scale
	}
	if column[pivot] == 0 {
		column[pivot] = 0 // no −0 on the diagonal
	}
}

// unit writes zeros above the pivot and one at it.
func unit(strip []float64, pivot, c int) {
	for i := range pivot {
		strip[i*lanes+c] = 0
	}
	strip[pivot*lanes+c] = 1
}

// storeReflectors copies n columns of the strip to reflectors base, base+1, ….
// Only rows from the first of their block on are ever read.
func (q *QR) storeReflectors(strip []float64, base, n int) {
	if base%lanes == 0 && n == lanes {
		from := base / blockColumns * blockColumns * lanes
		copy(q.reflectors(base / lanes)[from:], strip[from:])
		return
	}
	for c := range n {
		to, lane := q.reflectors((base+c)/lanes), (base+c)%lanes
		first := (base + c) / blockColumns * blockColumns
		if lane == 0 {
			clear(to[first*lanes:])
		}
		for i := first; i < q.rows; i++ {
			to[i*lanes+lane] = strip[i*lanes+c]
		}
	}
}

// extendT adds to the T of block b the rows of those new reflectors, first in
// the strip and number base in all, that belong to the block.
func (q *QR) extendT(b int, strip []float64, base int, tau []float64) {
	first := b * blockColumns
	if first >= base { // a block begins: T is triangular, the rest stays zero
		at := b * blockColumns * blockColumns
		clear(q.t[at : at+blockColumns*blockColumns])
	}
	from := max(base, first)
	last := min(base+len(tau), first+blockColumns)
	var g [blockStrips]square
	for j := 0; j*lanes < last-first; j++ {
		gram(&g[j], q.reflectors(b*blockStrips + j)[base*lanes:], strip[base*lanes:])
	}
	for k := from; k < last; k++ {
		c := k - base
		q.rowT(b, k-first, tau[c], func(i int) float64 { return g[i/lanes][i%lanes*lanes+c] })
	}
}

// rowT writes row j of −Tᵀ: with the products g = V[:, :j]ᵀ·v_j,
//
//	T[:j, j] = −tau·T[:j, :j]·g,   T[j, j] = tau.
func (q *QR) rowT(b, j int, tau float64, g func(int) float64) {
	for a := range j {
		t := q.blockT(b, a/lanes)
		sum := 0.0
		for i := a; i < j; i++ {
			sum += float64(t[i*lanes+a%lanes] * g(i))
		}
		t[j*lanes+a%lanes] = -tau * sum
	}
	q.blockT(b, j/lanes)[j*lanes+j%lanes] = -tau
}

// applyStrip applies the reflectors of strip a to the strips behind it, by their
// own 8×8 factor T.
func (q *QR) applyStrip(a, strips, base int, tau [lanes]float64) {
	v := q.strip(a)[base*lanes:]
	var g, t square
	gram(&g, v, v)
	for j := range tau {
		for i := range j {
			sum := 0.0
			for k := i; k < j; k++ {
				sum += float64(t[k*lanes+i] * g[k*lanes+j])
			}
			t[j*lanes+i] = -tau[j] * sum
		}
		t[j*lanes+j] = -tau[j]
	}
	for k := a + 1; k < strips; k++ {
		c := q.strip(k)[base*lanes:]
		var product, turned square
		gram(&product, v, c)
		update(turned[:], t[:], &product)
		update(c, v, &turned)
	}
}
