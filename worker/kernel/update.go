package kernel

// Update sets w[r] ← w[r] − Σ_j h[j]·cols[j][r], column after column in order.
// len(h) = len(cols). Four columns share one pass over a tile of w.
func Update[F Element](w []float64, cols [][]F, h []float64, r Range) {
	if len(h) != len(cols) {
		panic("kernel: coefficients and columns differ in number in Update")
	}
	for r.Lo < r.Hi {
		t := r.next(Tile)
		updateTile(w[t.Lo:t.Hi], w[t.Lo:t.Hi], cols, h, t.Lo)
	}
}

// Correct sets d[r] ← d[r] + Σ_j y[j]·cols[j][r], column after column in order.
// len(y) = len(cols).
func Correct[F Element](d []float64, cols [][]F, y []float64, r Range) {
	if len(y) != len(cols) {
		panic("kernel: coefficients and columns differ in number in Correct")
	}
	for r.Lo < r.Hi {
		t := r.next(Tile)
		tile := d[t.Lo:t.Hi]
		j := 0
		for ; j+4 <= len(cols); j += 4 {
			c := cols[j : j+4 : j+4]
			// d − (−y)·b has the bits of d + y·b.
			g := [4]float64{-y[j], -y[j+1], -y[j+2], -y[j+3]}
			update4(tile, tile, &g, c[0][t.Lo:t.Hi], c[1][t.Lo:t.Hi], c[2][t.Lo:t.Hi], c[3][t.Lo:t.Hi])
		}
		for ; j < len(cols); j++ {
			update1(tile, tile, -y[j], cols[j][t.Lo:t.Hi])
		}
	}
}

// Reduce sets w[r] ← w[r] − Σ_j h[j]·cols[j][r] and adds to out[j] the dot of the
// new w with cols[j] over r, and to out[len(cols)] the sum of its squares. The
// columns come from memory once: a piece of all of them stays in the second
// cache between update and dots. Classical Gram-Schmidt done twice so reads the
// basis three times a step, not four. w has the bits of Update; the sums are
// taken over pieces, whose length follows from the number of columns alone.
func Reduce[F Element](out, w []float64, cols [][]F, h []float64, r Range) {
	if len(h) != len(cols) || len(out) < len(cols)+1 {
		panic("kernel: coefficients, sums and columns differ in number in Reduce")
	}
	rows := pieceRows(len(cols))
	for r.Lo < r.Hi {
		t := r.next(rows)
		piece := w[t.Lo:t.Hi]
		updateTile(piece, piece, cols, h, t.Lo)
		dotsTile(out, piece, cols, t.Lo, nearby)
		out[len(cols)] += dot1(piece, piece, 0)
	}
}

// pieceRows is a divisor of Tile such that so many columns of it take 256 KiB
// of float64 at most, but no less than 64: all of Tile up to 32 columns.
func pieceRows(columns int) int {
	rows := Tile
	for rows > 64 && rows*columns*8 > 1<<18 {
		rows /= 2
	}
	return rows
}

// Next describes the basis vector that follows from w.
type Next[F Element] struct {
	W    []float64 // stays as it is
	Cols [][]F     // what W is made orthogonal to
	H    []float64 // length of Cols
	Norm float64   // not zero
	B    []F       // the new vector, no alias of the others
	// Window are the vectors, oldest first, whose dots with B are wanted; they
	// may be among Cols.
	Window [][]F
}

// Form sets B[r] = (W[r] − Σ_j H[j]·Cols[j][r])·(1/Norm), rounded to F, and in
// the same pass adds to gram[j] the dot of the stored B with Window[j] over r,
// and to gram[len(Window)] the sum of its squares.
func (n *Next[F]) Form(gram []float64, r Range) {
	if len(n.H) != len(n.Cols) || len(gram) < len(n.Window)+1 {
		panic("kernel: coefficients, sums and columns differ in number in Form")
	}
	// B joins the last one to three vectors of the window, so that a window of
	// four with B makes one group of four columns.
	var last [4][]F
	whole := len(n.Window) &^ 3
	rest := last[:copy(last[:], n.Window[whole:])+1]
	rest[len(rest)-1] = n.B
	var scratch [Tile]float64
	scale := 1 / n.Norm
	for r.Lo < r.Hi {
		t := r.next(Tile)
		tile := scratch[:t.Len()]
		updateTile(tile, n.W[t.Lo:t.Hi], n.Cols, n.H, t.Lo)
		scaleInto(n.B[t.Lo:t.Hi], tile, scale)
		dotsTile(gram, tile, n.Window[:whole], t.Lo, nearby)
		dotsTile(gram[whole:], tile, rest, t.Lo, nearby)
	}
}

// scaleGo is scaleInto in plain Go: b ← tile·factor rounded to F, tile ← b.
func scaleGo[F Element](b []F, tile []float64, factor float64) {
	b = b[:len(tile)]
	for i, v := range tile {
		s := F(v * factor)
		b[i], tile[i] = s, float64(s)
	}
}

// updateTile sets d ← w − Σ_j h[j]·cols[j][first:first+len(w)], one tile or less;
// d may be w.
func updateTile[F Element](d, w []float64, cols [][]F, h []float64, first int) {
	last := first + len(w)
	if len(cols) == 0 {
		copy(d, w)
	}
	j := 0
	for ; j+4 <= len(cols); j += 4 {
		c := cols[j : j+4 : j+4]
		update4(d, w, (*[4]float64)(h[j:]), c[0][first:last], c[1][first:last], c[2][first:last], c[3][first:last])
		w = d
	}
	for ; j < len(cols); j++ {
		update1(d, w, h[j], cols[j][first:last])
		w = d
	}
}

// update4Go is update4 in plain Go: d ← (((w − h₀c₀) − h₁c₁) − h₂c₂) − h₃c₃.
func update4Go[F Element](d, w []float64, h *[4]float64, c0, c1, c2, c3 []F) {
	h0, h1, h2, h3 := h[0], h[1], h[2], h[3]
	c0, c1, c2, c3 = c0[:len(w)], c1[:len(w)], c2[:len(w)], c3[:len(w)]
	d = d[:len(w)]
	for i, v := range w {
		v -= float64(h0 * float64(c0[i]))
		v -= float64(h1 * float64(c1[i]))
		v -= float64(h2 * float64(c2[i]))
		v -= float64(h3 * float64(c3[i]))
		d[i] = v
	}
}

// update1Go is update1 in plain Go: d ← w − h·c.
func update1Go[F Element](d, w []float64, h float64, c []F) {
	c, d = c[:len(w)], d[:len(w)]
	for i, v := range w {
		d[i] = v - float64(h*float64(c[i]))
	}
}

// Widen sets dst ← src, element by element. len(dst) = len(src).
func Widen[F Element](dst []float64, src []F) {
	if len(dst) != len(src) {
		panic("kernel: lengths disagree in Widen")
	}
	dst = dst[:len(src)]
	for i, v := range src {
		dst[i] = float64(v)
	}
}

// Narrow sets dst ← src, rounded to F. len(dst) = len(src).
func Narrow[F Element](dst []F, src []float64) {
	if len(dst) != len(src) {
		panic("kernel: lengths disagree in Narrow")
	}
	dst = dst[:len(src)]
	for i, v := range src {
		dst[i] = F(v)
	}
}
