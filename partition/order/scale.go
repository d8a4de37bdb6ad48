package order

import (
	"math"

	"rowstead/partition/csr"
)

// RowMax returns the largest |entry| of every row, 0 for an empty row. Length
// m.Rows.
func RowMax(m *csr.Matrix) []float64 {
	largest := make([]float64, m.Rows)
	for i := range largest {
		for _, v := range m.Val[m.Start[i]:m.Start[i+1]] {
			largest[i] = max(largest[i], math.Abs(v))
		}
	}
	return largest
}

// RowScale returns exponents e such that the largest |entry| of row i times
// 2^e[i] lies in [1, 2). A row without a nonzero has e[i] = 0. Exponents lie in
// [−1023, 1074]: those beyond 1023 belong to rows of subnormal numbers, and 2^e
// itself is then not a float64; ScaleRows and ScaleVector know that.
func RowScale(m *csr.Matrix) []int16 {
	e := make([]int16, m.Rows)
	for i, v := range RowMax(m) {
		e[i] = unitExponent(v)
	}
	return e
}

// unitExponent returns the e for which v·2^e lies in [1, 2); 0 for v = 0.
func unitExponent(v float64) int16 {
	if v == 0 {
		return 0
	}
	return int16(-math.Ilogb(v))
}

// SymmetricScale returns exponents e such that |a_ii|·2^(2·e[i]) lies in
// [½, 2): the scaling S·A·S that keeps symmetry. A row without a diagonal, or
// with a zero there, has e[i] = 0. m is square.
func SymmetricScale(m *csr.Matrix) []int16 {
	square(m)
	e := make([]int16, m.Rows)
	for i := range e {
		if d := m.At(i, i); d != 0 {
			// |d| = f·2^k with f in [1, 2): 2^(−2·⌈k/2⌉) takes it to f or f/2
			k := math.Ilogb(d)
			e[i] = int16(-((k + 1) >> 1))
		}
	}
	return e
}

// ScaleRows returns D·A with D = diag(2^e), sharing the pattern with m. lost
// counts the entries that are not exact: those that left the range of float64,
// mostly because they are 300 decades below the largest one of their row.
func ScaleRows(m *csr.Matrix, e []int16) (scaled *csr.Matrix, lost int) {
	return scaleBy(m, e, func(int32) int { return 0 })
}

// ScaleSymmetric returns S·A·S with S = diag(2^e), sharing the pattern with m;
// lost as in ScaleRows.
func ScaleSymmetric(m *csr.Matrix, e []int16) (scaled *csr.Matrix, lost int) {
	square(m)
	return scaleBy(m, e, func(c int32) int { return int(e[c]) })
}

func scaleBy(m *csr.Matrix, e []int16, column func(c int32) int) (scaled *csr.Matrix, lost int) {
	if len(e) != m.Rows {
		panic("order: a scale of another length than the rows")
	}
	scaled = &csr.Matrix{Rows: m.Rows, Cols: m.Cols, Start: m.Start, Col: m.Col, Val: make([]float64, len(m.Val))}
	for i := range m.Rows {
		for k := m.Start[i]; k < m.Start[i+1]; k++ {
			v, exact := shift(m.Val[k], int(e[i])+column(m.Col[k]))
			scaled.Val[k] = v
			if !exact {
				lost++
			}
		}
	}
	return scaled, lost
}

// ScaleVector sets y[i] = x[i]·2^e[i]; y may be x. With b of A·x = b it makes
// D·b, with t of S·A·S·t = S·b it makes x = S·t. lost as in ScaleRows; a number
// too large becomes infinite.
func ScaleVector(y, x []float64, e []int16) (lost int) {
	if len(x) != len(e) || len(y) != len(e) {
		panic("order: lengths disagree in ScaleVector")
	}
	for i, v := range x {
		w, exact := shift(v, int(e[i]))
		y[i] = w
		if !exact {
			lost++
		}
	}
	return lost
}

// shift returns v·2^e and whether that is exact.
func shift(v float64, e int) (w float64, exact bool) {
	if e >= -1022 && e <= 1023 {
		w = v * math.Float64frombits(uint64(e+1023)<<52) // 2^e
	} else {
		w = math.Ldexp(v, e)
	}
	if a := math.Abs(w); a >= 0x1p-1022 && a <= math.MaxFloat64 {
		return w, true
	}
	return w, math.Ldexp(w, -e) == v
}
