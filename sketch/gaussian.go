package sketch

import "math"

// Gaussian is the dense normal map of rows×n with entries N(0, 1/rows), the
// oracle that sparse operators are tested against. Column g follows from
// (seed, g) alone. It costs rows·n logarithms: for tests only.
type Gaussian struct {
	rows int
	seed uint64
}

// NewGaussian returns the dense oracle. It panics unless rows is positive and
// even.
func NewGaussian(rows int, seed uint64) Gaussian {
	if rows <= 0 || rows%2 != 0 {
		panic("sketch: a Gaussian oracle needs a positive even number of rows")
	}
	return Gaussian{rows: rows, seed: seed}
}

// Rows is the length of a sketch.
func (g Gaussian) Rows() int { return g.rows }

// Add adds S[:, firstRow:firstRow+len(w)]·w to dst, which has length Rows.
// Normal numbers come in pairs from two uniform ones (Box and Muller, 1958).
func (g Gaussian) Add(dst, w []float64, firstRow int) {
	if len(dst) != g.rows || firstRow < 0 {
		panic("sketch: dst of another length, or a negative first row")
	}
	scale := 1 / math.Sqrt(float64(g.rows))
	for i, x := range w {
		state := mix(g.seed ^ mix(uint64(firstRow+i)))
		for j := 0; j < g.rows; j += 2 {
			// u in (0, 1], so that its logarithm is finite; v in [0, 1).
			u := (float64(mix(state)>>11) + 1) * 0x1p-53
			state += golden
			v := float64(mix(state)>>11) * 0x1p-53
			state += golden
			radius := math.Sqrt(-2*math.Log(u)) * scale
			sin, cos := math.Sincos(2 * math.Pi * v)
			dst[j] += radius * cos * x
			dst[j+1] += radius * sin * x
		}
	}
}
