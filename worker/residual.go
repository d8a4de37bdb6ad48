package worker

import (
	"context"
	"math"

	"rowstead/worker/kernel"
)

// worstRows is how many rows with the largest row-wise errors are named.
const worstRows = 8

// Check recomputes r = b − A·x. It spends one product.
func (b *Block) Check(ctx context.Context) (ResidualSums, error) {
	if b.factors == nil {
		return ResidualSums{}, b.ready(false)
	}
	return b.residual(ctx, b.x, nil)
}

// residual recomputes r = b − A·v, every row with about twice the digits, and
// sets into ← D·r unless it is nil. The halo of v is brought first.
func (b *Block) residual(ctx context.Context, v, into []float64) (ResidualSums, error) {
	if err := b.gather(ctx, v); err != nil {
		return ResidualSums{}, err
	}
	parts := make([]ResidualSums, len(b.strips))
	b.each(func(strip int, r kernel.Range) {
		sums := &parts[strip]
		sums.Finite = true
		for i := r.Lo; i < r.Hi; i++ {
			cols, vals := b.matrix.Row(i)
			e := int(b.row[i])
			inner, _, size := kernel.ResidualRow(cols, vals, v, scaled(b.right[i], e))
			if into != nil {
				into[i] = inner
			}
			b.addRow(sums, i, inner, size)
			b.addSolution(sums, scaled(v[i], b.columnExponent(i)))
		}
	})
	sums := ResidualSums{Finite: true}
	for i := range parts {
		sums.add(&parts[i])
	}
	c := &b.constants
	sums.Right, sums.InnerRight, sums.ScaledRight, sums.RightMax = c.right, c.innerRight, c.scaledRight, c.rightMax
	sums.InnerMatrix, sums.MatrixMax = c.innerMatrix, c.matrixMax
	if !sums.Finite {
		sums.ResidualMax = math.Inf(1)
	}
	return sums, nil
}

// addRow adds row i with inner = (D·r)ᵢ and size = (D·(|A|·|x| + |b|))ᵢ.
func (b *Block) addRow(sums *ResidualSums, i int, inner, size float64) {
	e := -int(b.row[i])
	plain, largest := scaled(inner, e), b.entry[i]
	square(&sums.Inner, inner)
	square(&sums.True, plain)
	square(&sums.Scaled, inner/largest)
	square(&sums.TrueFloor, scaled(size, e))
	square(&sums.ScaledFloor, size/largest)
	a := math.Abs(plain)
	sums.ResidualMax = max(sums.ResidualMax, a)
	if !(a <= math.MaxFloat64) {
		sums.Finite = false
		sums.addWorst(b.firstRow+i, math.Inf(1))
		return
	}
	if inner == 0 {
		return
	}
	rowError := math.Abs(inner) / size
	if rowError != rowError {
		rowError = math.Inf(1)
	}
	sums.addWorst(b.firstRow+i, rowError)
}

// addSolution adds one entry of x in the units of the file.
func (b *Block) addSolution(sums *ResidualSums, x float64) {
	square(&sums.Solution, x)
	a := math.Abs(x)
	sums.SolutionMax = max(sums.SolutionMax, a)
	if !(a <= math.MaxFloat64) {
		sums.Finite = false
	}
}

// addWorst takes a row into the list of the worst. Rows come in ascending order;
// among equal errors the lower row stands first.
func (s *ResidualSums) addWorst(row int, rowError float64) {
	n := len(s.WorstError)
	if n == worstRows && rowError <= s.WorstError[n-1] {
		return
	}
	if n < worstRows {
		s.WorstRow, s.WorstError = append(s.WorstRow, 0), append(s.WorstError, 0)
		n++
	}
	at := n - 1
	for ; at > 0 && s.WorstError[at-1] < rowError; at-- {
		s.WorstRow[at], s.WorstError[at] = s.WorstRow[at-1], s.WorstError[at-1]
	}
	s.WorstRow[at], s.WorstError[at] = row, rowError
}

// add adds the sums over the rows that follow.
func (s *ResidualSums) add(part *ResidualSums) {
	addSquares(&s.Inner, part.Inner)
	addSquares(&s.True, part.True)
	addSquares(&s.Scaled, part.Scaled)
	addSquares(&s.TrueFloor, part.TrueFloor)
	addSquares(&s.ScaledFloor, part.ScaledFloor)
	addSquares(&s.Solution, part.Solution)
	for i, row := range part.WorstRow {
		s.addWorst(row, part.WorstError[i])
	}
	s.ResidualMax = max(s.ResidualMax, part.ResidualMax)
	s.SolutionMax = max(s.SolutionMax, part.SolutionMax)
	s.Finite = s.Finite && part.Finite
}
