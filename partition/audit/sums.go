package audit

import (
	"math"
	"slices"
	"sort"
)

// sums is what is known of the rows so far.
type sums struct {
	system    *system
	known     Result
	matrixMax wide // largest Σ |a| of a row
	columns   []columnSums
}

// columnSums is that of one right side. size is |A|·|x| + |b|.
type columnSums struct {
	x, b  []float64
	xTame bool

	residual, right, size                   squares
	scaledResidual, scaledRight, scaledSize squares
	residualMax                             wide
	worst                                   []RowError
}

func newSums(s *system) *sums {
	t := &sums{system: s, columns: make([]columnSums, s.right.Cols)}
	t.known = Result{Rows: s.rows, Unknowns: s.cols, Complex: s.isComplex, FirstZeroRow: -1}
	for j := range t.columns {
		x := s.answer.Column(j)
		t.columns[j] = columnSums{x: x, b: s.right.Column(j), xTame: allTame(x)}
	}
	return t
}

// addBand adds the rows of b, in order.
func (t *sums) addBand(b *band) error {
	for k := range b.hi - b.lo {
		i := b.lo + k
		cols, vals, duplicates := b.row(k)
		if duplicates > 0 {
			if err := t.system.checkFinite(i, cols, vals); err != nil {
				return err
			}
		}
		t.known.Entries += int64(len(cols))
		t.known.Duplicates += int64(duplicates)
		t.addRow(i, newRow(cols, vals))
	}
	return nil
}

func (t *sums) addRow(i int, r row) {
	if r.largest == 0 {
		if t.known.ZeroRows == 0 {
			t.known.FirstZeroRow, _ = t.system.fileRow(i)
		}
		t.known.ZeroRows++
	}
	t.matrixMax = t.matrixMax.larger(r.sum())
	divisor := r.divisor()
	for j := range t.columns {
		c := &t.columns[j]
		value, size, e := r.residual(c.x, c.xTame, c.b[i])
		c.add(widen(value, e), widen(size, e), widen(c.b[i], 0), divisor)
		if value != 0 {
			where := RowError{Error: math.Abs(value) / size}
			where.Row, where.Imaginary = t.system.fileRow(i)
			c.note(where)
		}
	}
}

func (c *columnSums) add(residual, size, right, divisor wide) {
	c.residual.add(residual)
	c.right.add(right)
	c.size.add(size)
	c.scaledResidual.add(residual.over(divisor))
	c.scaledRight.add(right.over(divisor))
	c.scaledSize.add(size.over(divisor))
	c.residualMax = c.residualMax.larger(residual)
}

// note keeps the worst rows, worst first, of equals the earlier ones.
func (c *columnSums) note(r RowError) {
	if len(c.worst) == worstRows && r.Error <= c.worst[worstRows-1].Error {
		return
	}
	at := sort.Search(len(c.worst), func(k int) bool { return c.worst[k].Error < r.Error })
	c.worst = slices.Insert(c.worst, at, r)
	c.worst = c.worst[:min(len(c.worst), worstRows)]
}

// result turns the sums over all rows into the verdict.
func (t *sums) result(tolerance float64) *Result {
	r := t.known
	r.MatrixMax, r.Tolerance, r.Met = t.matrixMax.float(), tolerance, true
	for j := range t.columns {
		c := t.columns[j].result(t.matrixMax)
		c.Met = c.True <= tolerance && c.Scaled <= tolerance
		r.Met = r.Met && c.Met
		r.Columns = append(r.Columns, c)
	}
	return &r
}

func (c *columnSums) result(matrixMax wide) Column {
	residual, right := c.residual.norm(), c.right.norm()
	rightMax, solutionMax := maxOf(c.b), maxOf(c.x)
	out := Column{
		True:        relative(residual, right),
		Scaled:      relative(c.scaledResidual.norm(), c.scaledRight.norm()),
		TrueFloor:   relative(c.size.norm().times(widen(epsilon, 0)), right),
		ScaledFloor: relative(c.scaledSize.norm().times(widen(epsilon, 0)), c.scaledRight.norm()),
		Worst:       c.worst,
		Residual:    residual.float(),
		Right:       right.float(),
		Solution:    normOf(c.x).float(),
		ResidualMax: c.residualMax.float(),
		RightMax:    rightMax,
		SolutionMax: solutionMax,
	}
	if len(c.worst) > 0 {
		out.RowWise = c.worst[0].Error
	}
	if c.residualMax.f != 0 {
		size := matrixMax.times(widen(solutionMax, 0)).plus(widen(rightMax, 0))
		out.Backward = c.residualMax.over(size).float()
	}
	return out
}

// relative is a/right, and a itself for no right side at all.
func relative(a, right wide) float64 {
	if right.f == 0 {
		return a.float()
	}
	return a.over(right).float()
}
