package method

import (
	"math"

	"rowstead/coordinator/small"
)

// column is one step of the recurrence: C·b_j = Σ h[i]·b_{lo+i} + norm·b_{j+1}.
type column struct {
	lo   int
	h    []float64
	norm float64
	sent []float64 // what is still to be taken off w, where that is not h
	ww   float64   // w·w
	// sketchW and holdW are S·C·b_j and S'·C·b_j where the recurrence holds only
	// to single precision; nil elsewhere.
	sketchW, holdW []float64
}

// recycled is the coordinator's part of a recycled space of d directions.
type recycled struct {
	d        int
	su, sazs []float64 // S·U and S·C·U, s×d
	hold     []float64 // S'·C·U
}

// projected is the small problem of one cycle: min over y of
// ‖S·(r − C·[U B]·y)‖. With [S·C·U, S·b₀, S·b₁, …] = Q·R the recurrence gives
// S·C·b_j in the basis Q as R times the column of coefficients, so that no
// product of sketch length is needed beyond the QR itself.
type projected struct {
	rows    int // s
	beta    float64
	space   recycled
	qr      *small.QR
	ls      *small.Hessenberg
	hold    []float64 // S'·b_i, one column a vector
	vectors int       // basis vectors in the QR
	columns []column
	solved  int // columns in ls
	warm    small.Warm
	scratch []float64
}

// assessment is what the small problem says after k columns.
type assessment struct {
	steps     int
	estimate  float64 // ‖S·(r − C·[U B]·y)‖
	debiased  float64 // estimate/(1 − k/s), close to the true norm
	holdout   float64 // ‖S'·(r − C·[U B]·y)‖
	condition float64 // of the sketched basis
	y, yu     []float64
}

func newProjected(rows, columns int) *projected {
	return &projected{
		rows: rows,
		qr:   small.NewQR(rows, columns),
		ls:   small.NewHessenberg(columns),
		hold: make([]float64, 0, HoldRows*columns),
	}
}

// begin starts a cycle with its recycled directions; beta is ‖D·r‖.
func (p *projected) begin(space recycled, beta float64) {
	p.qr.Reset()
	p.space, p.beta = space, beta
	p.hold, p.columns = p.hold[:0], p.columns[:0]
	p.vectors, p.solved = 0, 0
	p.warm.Reset()
	if space.d > 0 {
		p.qr.Append(space.sazs)
	}
}

// take appends further columns and the sketches of further basis vectors and
// solves every column whose next vector has come. It destroys sb.
func (p *projected) take(columns []column, sb, hold []float64) {
	p.columns = append(p.columns, columns...)
	p.qr.Append(sb)
	first := p.vectors == 0
	p.vectors += len(sb) / p.rows
	p.hold = append(p.hold, hold...)
	if first {
		p.ls.Reset(p.qr.R(), p.space.d, p.beta)
	}
	for p.solved < min(len(p.columns), p.vectors-1) {
		p.solveColumn(p.columns[p.solved], true)
	}
}

// breakDown solves a last column, whose next vector does not exist.
func (p *projected) breakDown(c column) {
	p.columns = append(p.columns, c)
	p.solveColumn(c, false)
}

// solveColumn brings S·C·b_j into the basis Q.
func (p *projected) solveColumn(c column, next bool) {
	d, j := p.space.d, p.solved
	length := d + j + 1
	if next {
		length++
	}
	out := p.room(length)
	if c.sketchW != nil {
		p.qr.TransposeApply(c.sketchW, out)
	} else {
		coefficients := append(make([]float64, 0, len(c.h)+1), c.h...)
		if next {
			coefficients = append(coefficients, c.norm)
		}
		p.qr.R().Combine(out, d+c.lo, coefficients)
	}
	p.ls.Append(out)
	p.solved++
}

func (p *projected) room(n int) []float64 {
	if cap(p.scratch) < n {
		p.scratch = make([]float64, 2*n)
	}
	return p.scratch[:n]
}

// assess solves for y after all columns so far.
func (p *projected) assess() assessment {
	d, k := p.space.d, p.solved
	a := assessment{steps: k, estimate: p.ls.Estimate()}
	a.debiased = a.estimate / max(0.2, 1-float64(k+d)/float64(p.rows))
	y := make([]float64, d+k)
	p.ls.Solve(y)
	a.yu, a.y = y[:d:d], y[d:]
	a.holdout = p.holdOut(a.y, a.yu)
	a.condition = p.qr.R().Condition(&p.warm)
	if math.IsNaN(a.condition) {
		a.condition = math.Inf(1)
	}
	return a
}

// holdOut is the norm of the residual in the sketch that nothing minimised.
func (p *projected) holdOut(y, yu []float64) float64 {
	k := len(y)
	weights := make([]float64, k+1) // of S'·b_i
	var res [HoldRows]float64
	weights[0] = p.beta
	for j, c := range p.columns[:k] {
		if c.holdW != nil {
			addScaled(res[:], c.holdW, -y[j])
			continue
		}
		for i, h := range c.h {
			weights[c.lo+i] -= float64(h * y[j])
		}
		weights[j+1] -= float64(c.norm * y[j])
	}
	for i, v := range weights {
		if (i+1)*HoldRows <= len(p.hold) {
			addScaled(res[:], p.hold[i*HoldRows:(i+1)*HoldRows], v)
		}
	}
	for i, v := range yu {
		addScaled(res[:], p.space.hold[i*HoldRows:(i+1)*HoldRows], -v)
	}
	return norm2(res[:])
}

// fullStep returns h = R⁻¹·Qᵀ·S·w for the basis vectors and the sketched norm
// of what is left of w.
func (p *projected) fullStep(sw []float64) (h []float64, norm float64) {
	d, n := p.space.d, p.space.d+p.vectors
	q, c := make([]float64, n), make([]float64, n)
	beyond := p.qr.Project(sw, q)
	copy(c, q)
	p.qr.R().Solve(c)
	h = append([]float64(nil), c[d:]...)
	// Only the part along B is taken off; the rows of U in R·c stay in w.
	clear(c[:d])
	out := make([]float64, n)
	p.qr.R().Mul(out, c)
	addScaled(q, out, -1)
	return h, math.Hypot(norm2(q), beyond)
}

func addScaled(dst, src []float64, a float64) {
	for i, v := range src {
		dst[i] += float64(a * v)
	}
}

func norm2(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += float64(x * x)
	}
	return math.Sqrt(sum)
}

// harmonic selects at most want directions for the next recycled space, from
// sketched data alone.
func (p *projected) harmonic(want int) (t []float64, directions int) {
	return small.HarmonicRitz(p.qr, p.ls, p.space.su, want)
}
