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
		var room residualRoom
		sums := &parts[strip]
		sums.Finite = true
		tiles(r, func(t kernel.Range) {
			b.residualRows(&room, v, t)
			if into != nil {
				copy(into[t.Lo:t.Hi], room.inner[:])
			}
			b.addTile(sums, &room, v, t)
		})
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

// residualRoom has a tile of D·r and of D·(|A|·|x| + |b|), and a column that is
// filled in turn.
type residualRoom struct{ inner, size, turn [kernel.Tile]float64 }

// residualRows fills room with rows t for x = v.
func (b *Block) residualRows(room *residualRoom, v []float64, t kernel.Range) {
	m := b.matrix
	right := room.turn[:t.Len()]
	scaledBy(right, b.right[t.Lo:t.Hi], b.row[t.Lo:t.Hi], 1)
	for i := t.Lo; i < t.Hi; i++ {
		cols, vals := m.Row(i)
		inner, _, size := kernel.ResidualRow(cols, vals, v, right[i-t.Lo])
		room.inner[i-t.Lo], room.size[i-t.Lo] = inner, size
	}
}

// addTile adds the rows t in room, and those of x = v, to sums.
func (b *Block) addTile(sums *ResidualSums, room *residualRoom, v []float64, t kernel.Range) {
	n := t.Len()
	inner, size, turn := room.inner[:n], room.size[:n], room.turn[:n]
	row, entry := b.row[t.Lo:t.Hi], b.entry[t.Lo:t.Hi]
	addTileSquares(&sums.Inner, inner)
	for i := range turn {
		turn[i] = inner[i] / entry[i]
	}
	addTileSquares(&sums.Scaled, turn)
	for i := range turn {
		turn[i] = size[i] / entry[i]
	}
	addTileSquares(&sums.ScaledFloor, turn)
	scaledBy(turn, size, row, -1)
	addTileSquares(&sums.TrueFloor, turn)
	scaledBy(turn, inner, row, -1)
	addTileSquares(&sums.True, turn)
	sums.ResidualMax = sums.addMax(sums.ResidualMax, turn)
	b.addRowErrors(sums, inner, size, t.Lo)

	x := v[t.Lo:t.Hi]
	if b.column != nil {
		scaledBy(turn, x, b.column[t.Lo:t.Hi], 1)
		x = turn
	}
	addTileSquares(&sums.Solution, x)
	sums.SolutionMax = sums.addMax(sums.SolutionMax, x)
}

// addRowErrors takes the row-wise errors of a tile that begins with row first into
// the worst; a row that is not finite counts as infinitely wrong.
func (b *Block) addRowErrors(sums *ResidualSums, inner, size []float64, first int) {
	least := sums.leastWorst()
	for i, v := range inner {
		e := math.Abs(v) / size[i]
		if e <= least || v == 0 {
			continue
		}
		if e != e {
			e = math.Inf(1)
		}
		sums.addWorst(b.firstRow+first+i, e)
		least = sums.leastWorst()
	}
}

// leastWorst is the error that a further row must exceed to be among the worst.
func (s *ResidualSums) leastWorst() float64 {
	if n := len(s.WorstError); n == worstRows {
		return s.WorstError[n-1]
	}
	return -1
}

// addMax returns the larger of most and ‖v‖∞, and notes what is not finite.
func (s *ResidualSums) addMax(most float64, v []float64) float64 {
	for _, x := range v {
		a := math.Abs(x)
		if a > most {
			most = a
		}
		if !(a <= math.MaxFloat64) {
			s.Finite = false
		}
	}
	return most
}

// addTileSquares adds the squares of v to s. Where their plain sum is neither tiny
// nor huge it will do: squares that underflow are below 2^-122 of it a row.
func addTileSquares(s *Squares, v []float64) {
	sum := kernel.SumSquares(v, kernel.Range{Lo: 0, Hi: len(v)})
	if sum >= 0x1p-900 && sum <= 0x1p900 {
		s[1] += sum
		return
	}
	squares(s, v)
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
