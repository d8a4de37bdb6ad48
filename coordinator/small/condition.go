package small

import "math"

// Warm keeps the singular vectors of the last Condition, so that the next one
// on a larger leading block starts close to its answer. The zero value is cold
// and ready.
type Warm struct {
	low, high []float64 // right singular vectors, or starts of them
	work      []float64
	known     int // leading entries of low and high that mean something
}

// NewWarm makes room for triangles up to capacity.
func NewWarm(capacity int) *Warm {
	w := &Warm{}
	w.grow(capacity)
	return w
}

// Reset makes w cold again and keeps its room.
func (w *Warm) Reset() { w.known = 0 }

func (w *Warm) grow(n int) {
	if n <= len(w.work) {
		return
	}
	w.low = append(make([]float64, 0, n), w.low...)[:n]
	w.high = append(make([]float64, 0, n), w.high...)[:n]
	w.work = make([]float64, n)
}

// start extends both vectors to n entries by fixed noise: of norm about one when
// cold, of a tenth when warm, so that a new direction is found in a few steps.
func (w *Warm) start(n int) (warm bool) {
	w.grow(n)
	size := 0.1
	if w.known == 0 || w.known > n {
		w.known, size = 0, 1
	}
	size /= math.Sqrt(float64(n))
	for i := w.known; i < n; i++ {
		w.low[i] = size * noise(uint64(n), uint64(i))
		w.high[i] = size * noise(^uint64(n), uint64(i))
	}
	return w.known > 0
}

const (
	// inverseSteps of inverse iteration on RᵀR and powerSteps of the power method,
	// warmSteps when it starts warm, bring the estimate within a factor of two of
	// the truth.
	inverseSteps = 3
	powerSteps   = 4
	warmSteps    = 2
)

// Condition estimates σ₁/σ_n of R by inverse iteration and the power method,
// started from warm (nil: cold), which it updates. The estimate is below the
// truth but for rounding, mostly by less than a tenth; it is +Inf when a
// diagonal entry is zero, a solve overflows or R holds a NaN.
//
// 14 passes over n²/2 numbers, 10 when warm, no allocation once warm has room. Golub and Van
// Loan, Matrix Computations, 4th ed., section 3.5.4.
func (t Triangle) Condition(warm *Warm) float64 {
	n := t.n
	if n == 0 {
		return 1
	}
	if warm == nil {
		warm = NewWarm(n)
	}
	steps := powerSteps
	if warm.start(n) {
		steps = warmSteps
	}
	low, high, work := warm.low[:n], warm.high[:n], warm.work[:n]
	inverse := t.inverseNorm(low, work)
	largest := t.largest(high, work, steps)
	if !isFinite(inverse) || !isFinite(largest) || !isFinite(inverse*largest) {
		warm.Reset()
		return math.Inf(1)
	}
	warm.known = n
	return max(1, inverse*largest)
}

// inverseNorm estimates ‖R⁻¹‖₂ and leaves the right singular vector in x.
func (t Triangle) inverseNorm(x, work []float64) float64 {
	for j := range t.n {
		if t.At(j, j) == 0 {
			return math.Inf(1)
		}
	}
	normalise(x)
	inverse := 0.0
	for range inverseSteps {
		copy(work, x)
		t.SolveTransposed(work) // z = R⁻ᵀ·x
		if n := normalise(work); !isFinite(n) {
			return math.Inf(1)
		}
		copy(x, work)
		t.Solve(x) // R⁻¹·z
		inverse = normalise(x)
		if !isFinite(inverse) {
			return math.Inf(1)
		}
	}
	return inverse
}

// largest estimates ‖R‖₂ and leaves the right singular vector in x.
func (t Triangle) largest(x, work []float64, steps int) float64 {
	normalise(x)
	top := 0.0
	for range steps {
		t.Mul(work, x)
		t.MulTransposed(x, work)
		top = math.Sqrt(normalise(x)) // ‖RᵀR·x‖ ≤ σ₁²
	}
	return top
}
