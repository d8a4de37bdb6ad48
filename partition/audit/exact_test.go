package audit

import (
	"math"
	"math/big"
	"slices"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"

	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

// exactBits holds any sum of products of float64 numbers, from 2^−2148 to 2^2048.
const exactBits = 4400

func exact(v float64) *big.Float { return new(big.Float).SetPrec(exactBits).SetFloat64(v) }

func exactMul(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(exactBits).Mul(a, b) }

func exactAdd(a, b *big.Float) *big.Float { return new(big.Float).SetPrec(exactBits).Add(a, b) }

func exactAbs(a *big.Float) *big.Float { return new(big.Float).SetPrec(exactBits).Abs(a) }

// over returns a/b to 300 bits, a itself for b = 0.
func over(a, b *big.Float) *big.Float {
	if b.Sign() == 0 {
		return a
	}
	return new(big.Float).SetPrec(300).Quo(a, b)
}

func rootOfSquares(v []*big.Float) *big.Float {
	sum := exact(0)
	for _, x := range v {
		x = new(big.Float).SetPrec(300).Set(x)
		sum = new(big.Float).SetPrec(700).Add(sum, new(big.Float).SetPrec(700).Mul(x, x))
	}
	return new(big.Float).SetPrec(300).Sqrt(sum)
}

func largestOf(v []*big.Float) *big.Float {
	largest := exact(0)
	for _, x := range v {
		if a := exactAbs(x); a.Cmp(largest) > 0 {
			largest = a
		}
	}
	return largest
}

// exactColumn is a Column by its definitions, in exact arithmetic.
type exactColumn struct {
	true, scaled, rowWise, backward, trueFloor, scaledFloor *big.Float
	residual, right, solution, size                         *big.Float // norms; size is |A|·|x| + |b|
}

func exactAudit(m *csr.Matrix, x, b []float64) exactColumn {
	var r, size, rb, sr, ssize, sb, solution []*big.Float
	rowWise, rowMax := exact(0), exact(0)
	for i := range m.Rows {
		cols, vals := m.Row(i)
		value, magnitude, sum, largest := exact(b[i]), exactAbs(exact(b[i])), exact(0), exact(0)
		for k, c := range cols {
			term := exactMul(exact(vals[k]), exact(x[c]))
			value = exactAdd(value, new(big.Float).Neg(term))
			magnitude, sum = exactAdd(magnitude, exactAbs(term)), exactAdd(sum, exactAbs(exact(vals[k])))
			largest = largestOf([]*big.Float{largest, exact(vals[k])})
		}
		if largest.Sign() == 0 {
			largest = exact(1)
		}
		r, size, rb = append(r, value), append(size, magnitude), append(rb, exact(b[i]))
		sr, ssize, sb = append(sr, over(value, largest)), append(ssize, over(magnitude, largest)), append(sb, over(exact(b[i]), largest))
		rowWise = largestOf([]*big.Float{rowWise, over(exactAbs(value), magnitude)})
		rowMax = largestOf([]*big.Float{rowMax, sum})
	}
	for _, v := range x {
		solution = append(solution, exact(v))
	}
	eps := exact(epsilon)
	backward := exact(0)
	if largestOf(r).Sign() != 0 {
		backward = over(largestOf(r), exactAdd(exactMul(rowMax, largestOf(solution)), largestOf(rb)))
	}
	right, scaledRight := rootOfSquares(rb), rootOfSquares(sb)
	return exactColumn{
		true: over(rootOfSquares(r), right), scaled: over(rootOfSquares(sr), scaledRight), rowWise: rowWise, backward: backward,
		trueFloor: over(exactMul(eps, rootOfSquares(size)), right), scaledFloor: over(exactMul(eps, rootOfSquares(ssize)), scaledRight),
		residual: rootOfSquares(r), right: right, solution: rootOfSquares(solution), size: rootOfSquares(size),
	}
}

// compare wants got within 1e-14 of want and slack: the sums carry 32 digits,
// and what is left are the few roundings of norms and quotients, and of plain
// sums of at most 61 magnitudes. Below the normal numbers a subnormal's rounding
// is allowed, above the largest float64 that one stands.
func compare(t *rapid.T, name string, got float64, want, slack *big.Float) {
	most := exact(math.MaxFloat64)
	if want.Cmp(most) > 0 {
		want = most
	}
	off := exactAbs(exactAdd(exact(got), new(big.Float).Neg(want)))
	allowed := exactAdd(exactMul(exact(1e-14), want), exactAdd(exact(0x1p-1074), slack))
	if off.Cmp(allowed) > 0 {
		t.Fatalf("%s = %v, exactly %v", name, got, want.Text('g', 20))
	}
}

// compareColumn allows a residual what double-double arithmetic leaves of at
// most 61 terms: 2⁻¹⁰⁴·61 < 2⁻⁹⁸ of |A|·|x| + |b|.
func compareColumn(t *rapid.T, got Column, want exactColumn) {
	none, part := exact(0), exact(0x1p-98)
	ofFloor := exactMul(part, exact(1/epsilon))
	compare(t, "true residual", got.True, want.true, exactMul(ofFloor, want.trueFloor))
	compare(t, "scaled residual", got.Scaled, want.scaled, exactMul(ofFloor, want.scaledFloor))
	compare(t, "row-wise error", got.RowWise, want.rowWise, part)
	compare(t, "backward error", got.Backward, want.backward, part)
	compare(t, "floor of the true residual", got.TrueFloor, want.trueFloor, none)
	compare(t, "floor of the scaled residual", got.ScaledFloor, want.scaledFloor, none)
	compare(t, "norm of the residual", got.Residual, want.residual, exactMul(part, want.size))
	compare(t, "norm of b", got.Right, want.right, none)
	compare(t, "norm of x", got.Solution, want.solution, none)
}

// job is a system in memory, audited as if it came from files.
type job struct {
	entries csr.Triplets
	rows    int
	x, b    []float64
}

// audited runs the audit behind the readers with bands of so many bytes.
func (j *job) audited(t *rapid.T, memory int64) *Result {
	s := &system{rows: j.rows, cols: j.rows,
		right:  &matfile.Dense{Rows: j.rows, Cols: 1, Values: j.b},
		answer: &matfile.Dense{Rows: j.rows, Cols: 1, Values: j.x}}
	counts := make([]int, j.rows)
	for _, i := range j.entries.I {
		counts[i]++
	}
	total := newSums(s)
	bands := cutBands(counts, memory)
	room := newBand(bands, counts)
	for _, r := range bands {
		room.place(r, counts)
		if !room.take(&j.entries) || !room.full() {
			t.Fatalf("band %v does not hold its entries", r)
		}
		if err := total.addBand(room); err != nil {
			t.Fatal(err)
		}
	}
	return total.result(1e-8)
}

func drawJob(t *rapid.T, number *rapid.Generator[float64]) *job {
	j := &job{rows: rapid.IntRange(1, 12).Draw(t, "rows")}
	for range rapid.IntRange(0, 5*j.rows).Draw(t, "entries") {
		j.entries.Add(rapid.IntRange(0, j.rows-1).Draw(t, "i"), rapid.IntRange(0, j.rows-1).Draw(t, "j"), number.Draw(t, "v"))
	}
	j.x = rapid.SliceOfN(number, j.rows, j.rows).Draw(t, "x")
	j.b = rapid.SliceOfN(number, j.rows, j.rows).Draw(t, "b")
	return j
}

// number draws f·2^e with e in [low, high], at times 0.
func number(low, high int) *rapid.Generator[float64] {
	return rapid.Custom(func(t *rapid.T) float64 {
		return math.Ldexp(rapid.Float64Range(-1, 1).Draw(t, "f"), rapid.IntRange(low, high).Draw(t, "e"))
	})
}

// Every number of an audit is the exact one to 14 digits, for numbers of
// everyday size as for those at the ends of float64.
func TestAuditAgreesWithExactArithmetic(t *testing.T) {
	for name, numbers := range map[string]*rapid.Generator[float64]{
		"everyday": number(-10, 10), "1e300 beside 1e-300": number(-1000, 1000), "tiny": number(-1074, -900), "huge": number(900, 1020),
	} {
		t.Run(name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				j := drawJob(t, numbers)
				m := j.entries.Matrix(j.rows, j.rows)
				if m.Check() != nil {
					t.Skip("duplicates overflowed")
				}
				got := j.audited(t, 1<<20)
				if got.Entries != int64(m.Entries()) || got.Duplicates != int64(len(j.entries.V)-m.Entries()) {
					t.Fatalf("%d entries and %d duplicates, want %d and %d", got.Entries, got.Duplicates, m.Entries(), len(j.entries.V)-m.Entries())
				}
				compareColumn(t, got.Columns[0], exactAudit(m, j.x, j.b))
			})
		})
	}
}

// A residual of pure rounding, of which plain sums have no correct digit, is
// right to 14 digits: b is A·x as float64 gives it. The same where the rounding
// of a product is below the least float64.
func TestAuditOfARoundedAnswer(t *testing.T) {
	for name, shift := range map[string]int{"everyday": 0, "tiny": -990, "huge": 990} {
		t.Run(name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				j := drawJob(t, number(-10, 10))
				for i := range j.x {
					j.x[i] = math.Ldexp(j.x[i], shift)
				}
				m := j.entries.Matrix(j.rows, j.rows)
				m.Mul(j.b, j.x)
				compareColumn(t, j.audited(t, 1<<20).Columns[0], exactAudit(m, j.x, j.b))
			})
		})
	}
}

// Rows with many duplicates are those of package csr, to the last bit.
func TestDuplicatesAreSummedInFileOrder(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var entries csr.Triplets
		for range rapid.IntRange(0, 120).Draw(t, "entries") {
			entries.Add(0, rapid.IntRange(0, 5).Draw(t, "column"), number(-40, 40).Draw(t, "v"))
		}
		counts := []int{len(entries.V)}
		b := newBand([]rowRange{{0, 1}}, counts)
		b.place(rowRange{0, 1}, counts)
		b.take(&entries)
		cols, vals, duplicates := b.row(0)
		wantCols, wantVals := entries.Matrix(1, 6).Row(0)
		if !slices.Equal(cols, wantCols) || !slices.Equal(vals, wantVals) || duplicates != len(entries.V)-len(vals) {
			t.Fatalf("row %v %v with %d duplicates, want %v %v", cols, vals, duplicates, wantCols, wantVals)
		}
	})
}

// A million roundings leave the norm right to the last bit but one.
func TestNormOfManyTerms(t *testing.T) {
	x := make([]float64, 1<<20)
	for i := range x {
		x[i] = 1.1
	}
	if got, want := normOf(x).float(), 1.1*1024; math.Abs(got-want) > epsilon*want {
		t.Errorf("norm of 2^20 times 1.1 is %v, want %v", got, want)
	}
}

// The same bits come out however many bands there are.
func TestBandsDoNotMatter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		j := drawJob(t, number(-30, 30))
		want := j.audited(t, 1<<20)
		besideBands := cmpopts.IgnoreFields(Result{}, "Bands")
		for _, memory := range []int64{1, 100, 500} {
			got := j.audited(t, memory)
			if diff := cmp.Diff(want, got, besideBands); diff != "" {
				t.Fatalf("%d bytes −want +got:\n%s", memory, diff)
			}
		}
	})
}
