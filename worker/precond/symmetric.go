package precond

import (
	"math"

	"rowstead/partition/csr"
)

// shiftFirst and shiftGrowth make the sequence of α: 0, 1e-3, 4e-3, 1.6e-2, …
// The first is far below what costs products; common practice, no source.
const (
	shiftFirst  = 1e-3
	shiftGrowth = 4
)

// symmetricILU0 factors a symmetric block into (I + L)·D·(I + L)ᵀ on its
// pattern, the incomplete Cholesky factor without roots. Where a pivot is not
// positive although every diagonal entry of A is, the factor is made again with
// the diagonal raised to (1+α)·aᵢᵢ, α growing until all pivots are positive,
// which they are once the raised block is diagonally dominant. Manteuffel, An
// incomplete factorization technique for positive definite linear systems.
func symmetricILU0(a *csr.Matrix, _ Options) ldu {
	hopeful, dominant := true, 0.0 // α at which every row is dominant
	for i := range a.Rows {
		_, vals := a.Row(i)
		d, sum := a.At(i, i), 0.0
		for _, v := range vals {
			sum += math.Abs(v)
		}
		hopeful = hopeful && d > pivotFloor*sum
		dominant = max(dominant, sum/d)
	}
	f := ilu0(a, 0)
	if hopeful && (!f.positive || len(f.pivots) > 0) {
		for shift := shiftFirst; shift <= shiftGrowth*dominant; shift *= shiftGrowth {
			if g := ilu0(a, shift); g.positive && len(g.pivots) == 0 && !g.broken {
				f = g
				break
			}
		}
	}
	f.upper = f.lower.Transpose()
	return f
}
