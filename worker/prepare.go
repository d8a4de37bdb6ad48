package worker

import (
	"context"
	"math"
	"slices"

	"rowstead/worker/kernel"
	"rowstead/worker/precond"
)

// constants are sums that change only with b, A or the scaling.
type constants struct {
	right, innerRight, scaledRight, innerMatrix Squares
	rightMax, matrixMax                         float64
}

// Prepare scales the block as p asks, exactly undoing an earlier scaling, and
// builds the preconditioner. x stays the same vector in the units of the file;
// basis and recycled space are dropped. An error is about p or the exchange.
func (b *Block) Prepare(ctx context.Context, p Preparation) (precond.Report, error) {
	row, column := b.given, []int16(nil)
	if p.Conjugate {
		var err error
		if row, column, err = b.symmetricExponents(ctx); err != nil {
			return precond.Report{}, err
		}
	}
	b.rescale(row, column)
	b.conjugate = p.Conjugate
	b.started, b.tried = false, false
	b.space.drop()
	b.matrixSums()
	b.rightSums()

	options := p.Options
	options.Symmetric = p.Conjugate
	options.Each = func(count int, do func(i int)) { b.team.Run(count, do) }
	b.turnRows(true)
	factors, report, err := precond.Build(p.Precondition, b.matrix, options)
	b.turnRows(false)
	if err != nil {
		return precond.Report{}, err
	}
	b.factors, b.identity = factors, report.Kind == precond.None
	return report, nil
}

// turnRows puts the own columns of every row before its halo columns, which is
// the order that preconditioners expect, or back into the order of global columns,
// in which the halo columns of lower blocks come first. Products keep to the latter,
// so that they have the bits of the product with the whole matrix.
func (b *Block) turnRows(ownFirst bool) {
	if b.lower == 0 {
		return
	}
	b.each(func(_ int, r kernel.Range) {
		for i := r.Lo; i < r.Hi; i++ {
			cols, vals := b.matrix.Row(i)
			from, to, end := len(cols), 0, 0 // lower halo columns [from, to), [0, end) turns
			for k, c := range cols {
				if j := int(c); j >= b.rows && j < b.rows+b.lower {
					from, to = min(from, k), k+1
				}
				if int(c) < b.rows+b.lower {
					end = k + 1
				}
			}
			switch {
			case to == 0:
			case ownFirst: // [lower own] to [own lower]
				turn(cols[:end], to)
				turn(vals[:end], to)
			default:
				turn(cols[:end], from)
				turn(vals[:end], from)
			}
		}
	})
}

// turn moves the first k elements of v behind the others.
func turn[E any](v []E, k int) {
	slices.Reverse(v[:k])
	slices.Reverse(v[k:])
	slices.Reverse(v)
}

// symmetricExponents returns e of S = 2^e for rows and for columns with halo, so
// that the diagonal of S·A·S lies in [1/2, 2); 0 where it is empty.
func (b *Block) symmetricExponents(ctx context.Context) (row, column []int16, err error) {
	row = make([]int16, b.rows)
	carried := make([]float64, b.matrix.Cols)
	for i := range row {
		cols, vals := b.matrix.Row(i)
		for k, c := range cols {
			if int(c) != i || vals[k] == 0 {
				continue
			}
			_, e := math.Frexp(vals[k])
			e -= int(b.row[i]) + b.columnExponent(i) // of the file's entry
			row[i] = int16(-(e >> 1))
		}
		carried[i] = float64(row[i])
	}
	if err := b.gather(ctx, carried); err != nil {
		return nil, nil, err
	}
	column = make([]int16, len(carried))
	for j, e := range carried {
		column[j] = int16(e)
	}
	return row, column, nil
}

func (b *Block) columnExponent(j int) int {
	if b.column == nil {
		return 0
	}
	return int(b.column[j])
}

// rescale turns matrix and x from the scaling they have to the one given.
func (b *Block) rescale(row, column []int16) {
	to := func(j int) int {
		if column == nil {
			return 0
		}
		return int(column[j])
	}
	b.each(func(_ int, r kernel.Range) {
		for i := r.Lo; i < r.Hi; i++ {
			cols, vals := b.matrix.Row(i)
			change := int(row[i]) - int(b.row[i])
			for k, c := range cols {
				vals[k] = scaled(vals[k], change+to(int(c))-b.columnExponent(int(c)))
			}
			b.x[i] = scaled(b.x[i], b.columnExponent(i)-to(i))
		}
	})
	copy(b.row, row)
	b.column = column
}

// scaled returns v·2^e.
func scaled(v float64, e int) float64 {
	if uint(e+1022) > 2045 { // 2^e is no normal number
		return math.Ldexp(v, e)
	}
	return v * math.Float64frombits(uint64(1023+e)<<52)
}

// scaledBy sets dst[i] = v[i]·2^(sign·e[i]); dst may be v.
func scaledBy(dst, v []float64, e []int16, sign int) {
	dst, e = dst[:len(v)], e[:len(v)]
	for i, x := range v {
		k := sign * int(e[i])
		if uint(k+1022) > 2045 {
			dst[i] = math.Ldexp(x, k)
			continue
		}
		dst[i] = x * math.Float64frombits(uint64(1023+k)<<52)
	}
}

// matrixSums finds the largest entry of every row, as it stands after scaling by
// the row's exponent alone, 1 for an empty row; and the constants of the matrix.
func (b *Block) matrixSums() {
	parts := make([]constants, len(b.strips))
	b.each(func(strip int, r kernel.Range) {
		part := &parts[strip]
		for i := r.Lo; i < r.Hi; i++ {
			cols, vals := b.matrix.Row(i)
			largest, sum := 0.0, 0.0
			for k, v := range vals {
				square(&part.innerMatrix, v)
				a := math.Abs(scaled(v, -b.columnExponent(int(cols[k]))))
				largest = max(largest, a)
				sum += a
			}
			if largest == 0 {
				largest = 1
			}
			b.entry[i] = largest
			part.matrixMax = max(part.matrixMax, scaled(sum, -int(b.row[i])))
		}
	})
	b.constants.innerMatrix, b.constants.matrixMax = Squares{}, 0
	for _, part := range parts {
		addSquares(&b.constants.innerMatrix, part.innerMatrix)
		b.constants.matrixMax = max(b.constants.matrixMax, part.matrixMax)
	}
}

// rightSums finds the constants of b, in the order in which residuals are summed:
// at x = 0 they are the same to the last bit.
func (b *Block) rightSums() {
	parts := make([]constants, len(b.strips))
	b.each(func(strip int, r kernel.Range) {
		part := &parts[strip]
		var turn [kernel.Tile]float64
		tiles(r, func(t kernel.Range) {
			v, inner := b.right[t.Lo:t.Hi], turn[:t.Len()]
			addTileSquares(&part.right, v)
			for _, x := range v {
				part.rightMax = max(part.rightMax, math.Abs(x))
			}
			scaledBy(inner, v, b.row[t.Lo:t.Hi], 1)
			addTileSquares(&part.innerRight, inner)
			for i := range inner {
				inner[i] /= b.entry[t.Lo+i]
			}
			addTileSquares(&part.scaledRight, inner)
		})
	})
	c := &b.constants
	c.right, c.innerRight, c.scaledRight, c.rightMax = Squares{}, Squares{}, Squares{}, 0
	for _, part := range parts {
		addSquares(&c.right, part.right)
		addSquares(&c.innerRight, part.innerRight)
		addSquares(&c.scaledRight, part.scaledRight)
		c.rightMax = max(c.rightMax, part.rightMax)
	}
}
