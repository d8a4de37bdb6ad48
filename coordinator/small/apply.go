package small

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

// applySingle is apply for one column, in lane 0 of the piece, with the same
// bits. Turned alone it keeps pace with the reflectors' way through memory.
func (q *QR) applySingle(n int) {
	strip, x := q.strip(0), q.vector
	for i := range x {
		x[i] = strip[i*lanes]
	}
	for b := 0; b*blockColumns < n; b++ {
		q.applyToVector(x, b)
	}
	for i := range x {
		strip[i*lanes] = x[i]
		clear(strip[i*lanes+1 : (i+1)*lanes])
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
			column := a[j*q.rows : (j+1)*q.rows]
			q.scale[j] = powerOfTwo(largestOf(column))
			q.load(j, column, q.scale[j])
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
