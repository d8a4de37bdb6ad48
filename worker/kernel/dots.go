package kernel

// Element is the form in which basis vectors are stored.
type Element interface{ float32 | float64 }

// Dots adds Σ_{i in r} w[i]·cols[j][i] to out[j] for every column.
//
//	out   length at least len(cols)
//	w     all local rows
//	cols  all local rows each
//	r     from a multiple of Tile
//
// Four columns share one pass over a tile of w. 2·k multiplications and
// additions a row; k columns are read once.
func Dots[F Element](out, w []float64, cols [][]F, r Range) {
	if len(out) < len(cols) {
		panic("kernel: fewer sums than columns in Dots")
	}
	for r.Lo < r.Hi {
		t := r.next(Tile)
		dotsTile(out, w[t.Lo:t.Hi], cols, t.Lo, nearby)
	}
}

// SumSquares returns Σ_{i in r} w[i]², tiles added in order from zero.
func SumSquares[F Element](w []F, r Range) float64 {
	var scratch [Tile]float64
	wide, isWide := any(w).([]float64)
	total := 0.0
	for r.Lo < r.Hi {
		t := r.next(Tile)
		tile := scratch[:t.Len()]
		if isWide {
			tile = wide[t.Lo:t.Hi]
		} else {
			Widen(tile, w[t.Lo:t.Hi])
		}
		total += dot1(tile, tile, nearby)
	}
	return total
}

// nearby is how many rows a pass over columns in memory asks for in advance.
const nearby = 128

// dotsTile adds w·cols[j][first:first+len(w)] to out[j], one tile or less, and
// asks for the rows of the columns that stand ahead further on.
func dotsTile[F Element](out, w []float64, cols [][]F, first, ahead int) {
	last := first + len(w)
	j := 0
	for ; j+4 <= len(cols); j += 4 {
		c := cols[j : j+4 : j+4]
		s := dot4(w, c[0][first:last], c[1][first:last], c[2][first:last], c[3][first:last], ahead)
		out[j] += s[0]
		out[j+1] += s[1]
		out[j+2] += s[2]
		out[j+3] += s[3]
	}
	for ; j < len(cols); j++ {
		out[j] += dot1(w, cols[j][first:last], ahead)
	}
}

// tree adds the eight lanes of a sum in the order that every variant follows.
func tree(a *[8]float64) float64 {
	b0, b1, b2, b3 := a[0]+a[4], a[1]+a[5], a[2]+a[6], a[3]+a[7]
	return (b0 + b2) + (b1 + b3)
}

// dot4Go is dot4 in plain Go: four columns against w, all of one length.
func dot4Go[F Element](w []float64, c0, c1, c2, c3 []F) [4]float64 {
	return [4]float64{dot1Go(w, c0), dot1Go(w, c1), dot1Go(w, c2), dot1Go(w, c3)}
}

// dot1Go is dot1 in plain Go: w·c in eight lanes, which are written out so that
// they stay in registers.
func dot1Go[F Element](w []float64, c []F) float64 {
	var a0, a1, a2, a3, a4, a5, a6, a7 float64
	c = c[:len(w)]
	i := 0
	for ; i+8 <= len(w); i += 8 {
		v, p := (*[8]float64)(w[i:]), (*[8]F)(c[i:])
		a0 += float64(v[0] * float64(p[0]))
		a1 += float64(v[1] * float64(p[1]))
		a2 += float64(v[2] * float64(p[2]))
		a3 += float64(v[3] * float64(p[3]))
		a4 += float64(v[4] * float64(p[4]))
		a5 += float64(v[5] * float64(p[5]))
		a6 += float64(v[6] * float64(p[6]))
		a7 += float64(v[7] * float64(p[7]))
	}
	a := [8]float64{a0, a1, a2, a3, a4, a5, a6, a7}
	for l := 0; i < len(w); i, l = i+1, l+1 {
		a[l&7] += float64(w[i] * float64(c[i]))
	}
	return tree(&a)
}
