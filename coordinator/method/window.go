package method

import "math"

// maxWindow is the widest window; wider ones cost more vector traffic than a
// full step now and then.
const maxWindow = 16

// window keeps the Gram matrix of the newest basis vectors, which makes the
// truncated recurrence exact in the Euclidean inner product: without it the
// condition of the basis reaches 1e12 within some tens of steps.
type window struct {
	size int // vectors kept at most
	held int
	gram [maxWindow * maxWindow]float64 // held×held, row stride maxWindow
}

func (w *window) reset(size int) { w.size, w.held = min(size, maxWindow), 0 }

// push takes the Gram column of a new vector: its inner products with the
// vectors held and with itself, oldest first.
func (w *window) push(column []float64) {
	if len(column) > w.size {
		column = column[len(column)-w.size:]
	}
	for w.held >= len(column) && w.held > 0 {
		w.dropOldest()
	}
	n := w.held
	column = column[len(column)-n-1:]
	for i, v := range column {
		w.gram[n*maxWindow+i], w.gram[i*maxWindow+n] = v, v
	}
	w.held++
}

func (w *window) dropOldest() {
	for i := 1; i < w.held; i++ {
		for j := 1; j < w.held; j++ {
			w.gram[(i-1)*maxWindow+j-1] = w.gram[i*maxWindow+j]
		}
	}
	w.held--
}

// newest is b·b of the newest vector.
func (w *window) newest() float64 { return w.gram[(w.held-1)*maxWindow+w.held-1] }

// project solves G·h = dots for the newest vectors and returns h, which may be
// shorter than dots when the oldest of them are dependent, and
// ‖w − Σ h·b‖ = √(w·w − dots·h). That difference cancels, so the norm is kept at
// 1e-8·‖w‖ or more; the next Gram column tells the true one.
func (w *window) project(dots []float64, ww float64) (h []float64, norm float64) {
	for first := w.held - len(dots); ; first++ {
		if first < 0 {
			panic("method: more dots than vectors in the window")
		}
		if first == w.held {
			return nil, math.Sqrt(ww)
		}
		d := dots[len(dots)-(w.held-first):]
		h, ok := w.cholesky(first, d)
		if !ok {
			continue
		}
		left := ww
		for i, v := range h {
			left -= float64(v * d[i])
		}
		return h, math.Sqrt(max(left, 1e-16*ww))
	}
}

// cholesky solves the trailing block of the Gram matrix from first on; it
// refuses pivots below 1e-14 of their diagonal.
func (w *window) cholesky(first int, d []float64) ([]float64, bool) {
	n := w.held - first
	var l [maxWindow * maxWindow]float64
	h := append([]float64(nil), d...)
	for i := range n {
		for j := range i + 1 {
			sum := w.gram[(first+i)*maxWindow+first+j]
			for k := range j {
				sum -= float64(l[i*maxWindow+k] * l[j*maxWindow+k])
			}
			if i > j {
				l[i*maxWindow+j] = sum / l[j*maxWindow+j]
				continue
			}
			if !(sum > 1e-14*w.gram[(first+i)*maxWindow+first+i]) {
				return nil, false
			}
			l[i*maxWindow+i] = math.Sqrt(sum)
		}
	}
	for i := range n { // L·u = d
		for k := range i {
			h[i] -= float64(l[i*maxWindow+k] * h[k])
		}
		h[i] /= l[i*maxWindow+i]
	}
	for i := n - 1; i >= 0; i-- { // Lᵀ·h = u
		for k := i + 1; k < n; k++ {
			h[i] -= float64(l[k*maxWindow+i] * h[k])
		}
		h[i] /= l[i*maxWindow+i]
	}
	return h, true
}
