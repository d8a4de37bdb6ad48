package small

// lanes is the width of a strip: eight columns stored row by row, so that row i
// of a strip is strip[8·i : 8·i+8]. Eight doubles are one cache line and one
// AVX-512 register or two of AVX2.
const lanes = 8

// square is an 8×8 matrix, row by row.
type square = [lanes * lanes]float64

// gramGo adds Vᵀ·C to w for two strips of the same number of rows n:
//
//	w[8·j+c] += Σ_i v[8·i+j]·c[8·i+c],   i ascending, one sum after the other
//
// 128·n flops. Every element is one chain of rounded products and rounded sums,
// so that any vector width gives the same bits.
func gramGo(w *square, v, c []float64) {
	for j := 0; j < lanes; j += 2 {
		for k := 0; k < lanes; k += 2 {
			gramPart(w, v, c, j, k)
		}
	}
}

// gramPart is gramGo for columns j, j+1 of V and k, k+1 of C. Four sums and
// their products are what the compiler keeps in registers.
func gramPart(w *square, v, c []float64, j, k int) {
	a, b := w[lanes*j+k:][:2:2], w[lanes*(j+1)+k:][:2:2]
	a0, a1, b0, b1 := a[0], a[1], b[0], b[1]
	v = v[:len(c)]
	for i := 0; i <= len(c)-lanes; i += lanes {
		x0, x1, y0, y1 := v[i+j], v[i+j+1], c[i+k], c[i+k+1]
		a0 += float64(x0 * y0)
		a1 += float64(x0 * y1)
		b0 += float64(x1 * y0)
		b1 += float64(x1 * y1)
	}
	a[0], a[1], b[0], b[1] = a0, a1, b0, b1
}

// updateGo subtracts V·W from C for two strips of the same number of rows n:
//
//	c[8·i+k] −= v[8·i+j]·w[8·j+k],   j = 0 … 7 one after the other
//
// 128·n flops, the same bits whatever the vector width.
func updateGo(c, v []float64, w *square) {
	if len(v) == 0 {
		return
	}
	for j := 0; j < lanes; j += 4 {
		for k := 0; k < lanes; k += 2 {
			updatePart(c, v, w, j, k)
		}
	}
}

// updatePart is updateGo for columns j … j+3 of V and k, k+1 of C.
func updatePart(c, v []float64, w *square, j, k int) {
	w0, w1, w2, w3 := w[lanes*j+k], w[lanes*(j+1)+k], w[lanes*(j+2)+k], w[lanes*(j+3)+k]
	k1 := k + 1
	u0, u1, u2, u3 := w[lanes*j+k1], w[lanes*(j+1)+k1], w[lanes*(j+2)+k1], w[lanes*(j+3)+k1]
	v, c = v[j:], c[k:]
	for len(v) >= 4 && len(c) >= 2 {
		v0, v1, v2, v3 := v[0], v[1], v[2], v[3]
		c[0] = c[0] - float64(v0*w0) - float64(v1*w1) - float64(v2*w2) - float64(v3*w3)
		c[1] = c[1] - float64(v0*u0) - float64(v1*u1) - float64(v2*u2) - float64(v3*u3)
		if len(v) < lanes || len(c) < lanes {
			break
		}
		v, c = v[lanes:], c[lanes:]
	}
}

// rowDots sets w[k] = Σ_i x[8·i+lane]·x[8·i+k]: the products of one column of a
// strip with all eight.
func rowDots(w *[lanes]float64, x []float64, lane int) {
	var w0, w1, w2, w3, w4, w5, w6, w7 float64
	lane &= lanes - 1
	for len(x) >= lanes {
		a := (*[lanes]float64)(x)
		v := a[lane]
		w0 += float64(v * a[0])
		w1 += float64(v * a[1])
		w2 += float64(v * a[2])
		w3 += float64(v * a[3])
		w4 += float64(v * a[4])
		w5 += float64(v * a[5])
		w6 += float64(v * a[6])
		w7 += float64(v * a[7])
		x = x[lanes:]
	}
	*w = [lanes]float64{w0, w1, w2, w3, w4, w5, w6, w7}
}

// rowUpdate scales column lane of a strip by scale to v, and subtracts v·w[k]
// from every column k. w[lane] must be zero.
func rowUpdate(x []float64, lane int, scale float64, w *[lanes]float64) {
	w0, w1, w2, w3, w4, w5, w6, w7 := w[0], w[1], w[2], w[3], w[4], w[5], w[6], w[7]
	lane &= lanes - 1
	for len(x) >= lanes {
		a := (*[lanes]float64)(x)
		v := a[lane] * scale
		a[0] -= float64(v * w0)
		a[1] -= float64(v * w1)
		a[2] -= float64(v * w2)
		a[3] -= float64(v * w3)
		a[4] -= float64(v * w4)
		a[5] -= float64(v * w5)
		a[6] -= float64(v * w6)
		a[7] -= float64(v * w7)
		a[lane] = v
		x = x[lanes:]
	}
}

// vectorGram adds Vᵀ·x to w for a strip V and a vector x: gramGo for one column.
func vectorGram(w *[lanes]float64, v, x []float64) {
	for j := 0; j < lanes; j += 4 {
		w0, w1, w2, w3 := w[j], w[j+1], w[j+2], w[j+3]
		v := v[:lanes*len(x)]
		for i, f := range x {
			k := i*lanes + j
			w0 += float64(f * v[k])
			w1 += float64(f * v[k+1])
			w2 += float64(f * v[k+2])
			w3 += float64(f * v[k+3])
		}
		w[j], w[j+1], w[j+2], w[j+3] = w0, w1, w2, w3
	}
}

// vectorUpdate subtracts V·w from x: updateGo for one column.
func vectorUpdate(x, v []float64, w *[lanes]float64) {
	w0, w1, w2, w3, w4, w5, w6, w7 := w[0], w[1], w[2], w[3], w[4], w[5], w[6], w[7]
	for i := 0; i < len(x) && len(v) >= lanes; i++ {
		a := (*[lanes]float64)(v)
		x[i] = x[i] - float64(a[0]*w0) - float64(a[1]*w1) - float64(a[2]*w2) - float64(a[3]*w3) -
			float64(a[4]*w4) - float64(a[5]*w5) - float64(a[6]*w6) - float64(a[7]*w7)
		v = v[lanes:]
	}
}
