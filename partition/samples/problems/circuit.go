package problems

import (
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// Circuit is the conductance matrix of an invented network of n nodes and 2n
// branches: seven branches of ten go to a node at most 39 numbers away, the
// others anywhere before with a preference for the first nodes, which become
// hubs. Conductances 10^U(−3, 2); n/50 connections to ground of 10^U(−2, 1) and
// 1e-9 at every node; n/20 controlled sources of 10^U(−2, 1) make it
// nonsymmetric. n ≥ 50.
func Circuit(n int, seed uint64) *csr.Matrix {
	if n < 50 {
		panic("problems: a circuit needs 50 nodes")
	}
	var t csr.Triplets
	diagonal := make([]float64, n)
	branches(n, seed, func(a, b int, g float64) {
		diagonal[a] += g
		diagonal[b] += g
		t.Add(a, b, -g)
		t.Add(b, a, -g)
	})
	ground, value := fixed.NewStream(seed, streamGround), fixed.NewStream(seed, streamGroundValue)
	for i := range n / 50 {
		diagonal[ground.Below(i, n)] += value.PowerOfTen(i, -2, 1)
	}
	for i, d := range diagonal {
		t.Add(i, i, d+1e-9)
	}
	row, reach, gain := fixed.NewStream(seed, streamGainRow), fixed.NewStream(seed, streamGainReach), fixed.NewStream(seed, streamGainValue)
	for i := range n / 20 {
		at := row.Below(i, n)
		from := min(max(at+reach.Below(i, 60)-30, 0), n-1)
		g := gain.PowerOfTen(i, -2, 1)
		t.Add(at, from, g)
		t.Add(at, min(from+5, n-1), -g)
	}
	return t.Matrix(n, n)
}

// branches calls each with the two ends and the conductance of every branch.
func branches(n int, seed uint64, each func(a, b int, g float64)) {
	source, target := fixed.NewStream(seed, streamSource), fixed.NewStream(seed, streamTarget)
	local, reach := fixed.NewStream(seed, streamLocal), fixed.NewStream(seed, streamReach)
	conductance := fixed.NewStream(seed, streamConductance)
	for i := range 2 * n {
		a := i + 1
		if i >= n-1 {
			a = 1 + source.Below(i, n-1)
		}
		u := target.Uniform(i)
		b := int(math.Floor(u * u * float64(a)))
		if local.Uniform(i) < 0.7 {
			b = max(a-1-reach.Below(i, 39), 0)
		}
		if a != b {
			each(a, b, conductance.PowerOfTen(i, -3, 2))
		}
	}
}

// BadRows returns a with every row i multiplied by 10^U(−decades, decades): the
// same equations in units that nobody would choose.
func BadRows(a *csr.Matrix, decades float64, seed uint64) *csr.Matrix {
	s := fixed.NewStream(seed, streamRowScale)
	out := &csr.Matrix{Rows: a.Rows, Cols: a.Cols, Start: append([]int(nil), a.Start...), Col: append([]int32(nil), a.Col...), Val: append([]float64(nil), a.Val...)}
	for i := range out.Rows {
		scale := s.PowerOfTen(i, -decades, decades)
		_, vals := out.Row(i)
		for k := range vals {
			vals[k] *= scale
		}
	}
	return out
}
