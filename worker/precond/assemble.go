package precond

import (
	"fmt"
	"math"

	"rowstead/partition/csr"
)

// Growth bounds of a factor. Beyond certainGrowth it is unstable. Beyond
// suspectGrowth it is unstable if M⁻¹ is also a worse guess than nothing
// (misfit above 1); an ill-conditioned block whose factor is nearly exact is
// kept. The test is that of Chow and Saad, Experimental study of ILU
// preconditioners for indefinite matrices. The bound is measured: GMRES without
// restart on skew and indefinite stencils of 20² to 40² points took fewer steps
// with ilu0 than with the diagonal up to a growth of 1e9, from 5e9 on as many.
const (
	suspectGrowth = 1e10
	certainGrowth = 1e15
)

// trial is what one part of a factor looks like.
type trial struct {
	entries        int
	pivots         []int // rows of the row block
	growth, misfit float64
	positive       bool
	shift          float64
	broken         bool
}

// assemble factors the sub-blocks, lays them out in parts and tries each part;
// fault is set when the whole is unstable.
func assemble(a *csr.Matrix, o Options, r *Report, factor func(*csr.Matrix, Options) ldu) (Preconditioner, string) {
	if o.SingleFactors {
		return assembleIn[float32](a, o, r, factor)
	}
	return assembleIn[float64](a, o, r, factor)
}

func assembleIn[F float32 | float64](a *csr.Matrix, o Options, r *Report, factor func(*csr.Matrix, Options) ldu) (Preconditioner, string) {
	cuts := blockCuts(a.Rows, o)
	r.Blocks = len(cuts) - 1
	groups := partCuts(r.Blocks, o)
	long := longRows(a, o, r.Kind)
	f := &factored[F]{rows: a.Rows, parts: make([]part[F], len(groups)-1)}
	trials := make([]trial, len(f.parts))
	o.Each(len(f.parts), func(p int) {
		own := cuts[groups[p] : groups[p+1]+1]
		blocks := make([]*csr.Matrix, len(own)-1)
		factors := make([]ldu, len(blocks))
		for b := range blocks {
			blocks[b] = diagonalBlock(a, own[b], own[b+1])
			factors[b] = factor(blocks[b], o)
		}
		f.parts[p] = pack[F](own[0], factors)
		f.parts[p].long = long
		for b := range factors {
			factors[b].lower, factors[b].upper = nil, nil // packed: free the memory
		}
		trials[p] = f.parts[p].try(own, blocks, factors)
	})
	r.PositiveDefinite = o.Symmetric
	broken := false
	for _, t := range trials {
		r.Entries += t.entries
		for _, i := range t.pivots {
			r.replaced(i)
		}
		r.Growth, r.Misfit = worse(r.Growth, t.growth), worse(r.Misfit, t.misfit)
		r.Shift = max(r.Shift, t.shift)
		r.PositiveDefinite = r.PositiveDefinite && t.positive
		broken = broken || t.broken
	}
	if r.Shift > 0 {
		r.Reason = fmt.Sprintf("the diagonal was raised by %.2g of itself to keep the pivots positive", r.Shift)
	}
	return f, verdict(r, broken)
}

// longRow is the number of entries from which summing a row in two strands is
// the quicker (measured 4.1 against 4.9 products at 20 entries, 1.4 against 1.0
// at 3).
const longRow = 8

// longRows says whether rows of L and U are expected to be long. It decides about
// bits, so it rests on the whole row block, not on parts.
func longRows(a *csr.Matrix, o Options, kind string) bool {
	if kind == ILUT {
		return o.Fill >= longRow
	}
	return localEntries(a) >= a.Rows*(2*longRow+1)
}

// verdict says in plain words why a factor is unstable, or nothing.
func verdict(r *Report, broken bool) string {
	switch {
	case broken || math.IsNaN(r.Growth) || math.IsInf(r.Growth, 0):
		return "the numbers in its factors overflow"
	case r.Growth > certainGrowth, r.Growth > suspectGrowth && !(r.Misfit <= 1):
		return fmt.Sprintf("its factors are unstable, a right side of ones becomes %.1e", r.Growth)
	}
	return ""
}

// try solves with the part for the right sides +d and ±d, d the largest entry of
// each row, signs from a hash of the row in its sub-block. own are the first
// rows of its sub-blocks and the end, blocks their matrices.
func (p *part[F]) try(own []int, blocks []*csr.Matrix, factors []ldu) trial {
	rows := p.hi - p.lo
	t := trial{entries: rows + len(p.lower.col) + len(p.upper.col), positive: true}
	for b, f := range factors {
		for _, i := range f.pivots {
			t.pivots = append(t.pivots, own[b]+i)
		}
		t.positive, t.broken = t.positive && f.positive, t.broken || f.broken
		t.shift = max(t.shift, f.shift)
	}
	alone := *p
	alone.lo, alone.hi = 0, rows
	z, right, ax := make([]float64, rows), make([]float64, rows), make([]float64, rows)
	for _, signed := range []bool{false, true} {
		for b, m := range blocks {
			fillTrial(right[own[b]-p.lo:own[b+1]-p.lo], m, signed)
		}
		alone.solve(z, right)
		for b, m := range blocks {
			lo, hi := own[b]-p.lo, own[b+1]-p.lo
			m.Mul(ax[:m.Rows], z[lo:hi])
			growth, misfit := measure(m, z[lo:hi], right[lo:hi], ax)
			t.growth, t.misfit = worse(t.growth, growth), worse(t.misfit, misfit)
		}
	}
	return t
}

// fillTrial sets right to the largest entry of each row of m, 1 in empty rows,
// with signs from a hash if signed.
func fillTrial(right []float64, m *csr.Matrix, signed bool) {
	for i := range right {
		_, vals := m.Row(i)
		right[i] = orOne(maxAbs(vals))
		if signed && splitmix(uint64(i))&1 == 1 {
			right[i] = -right[i]
		}
	}
}

// measure returns max |z|ᵢ·cᵢ, with cᵢ the largest |a_ki/right_k| of column i or
// 1 if there is none, and max |(ax − right)ᵢ/rightᵢ|.
func measure(m *csr.Matrix, z, right, ax []float64) (growth, misfit float64) {
	c := make([]float64, m.Cols)
	for i := range m.Rows {
		cols, vals := m.Row(i)
		for k, j := range cols {
			c[j] = max(c[j], math.Abs(vals[k]/right[i]))
		}
	}
	for i, v := range z {
		growth = worse(growth, math.Abs(v)*orOne(c[i]))
		misfit = worse(misfit, math.Abs((ax[i]-right[i])/right[i]))
	}
	return growth, misfit
}

// worse is the larger of a and b, NaN if one of them is.
func worse(a, b float64) float64 {
	if math.IsNaN(a) || a > b {
		return a
	}
	return b
}

// splitmix is the output function of the splitmix64 generator: Steele, Lea and
// Flood, Fast splittable pseudorandom number generators.
func splitmix(z uint64) uint64 {
	z += 0x9e3779b97f4a7c15
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}
