package precond

import (
	"math"
	"slices"
	"strings"
	"sync"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// drawOptions draws options that make several sub-blocks of few rows.
func drawOptions(t *rapid.T) Options {
	return Options{
		Drop:          rapid.SampledFrom([]float64{-1, 0, 0.1}).Draw(t, "drop"),
		Fill:          rapid.IntRange(0, 5).Draw(t, "fill"),
		SubBlocks:     rapid.IntRange(0, 7).Draw(t, "sub-blocks"),
		Interleave:    rapid.IntRange(0, 4).Draw(t, "interleave"),
		Node:          rapid.IntRange(0, 3).Draw(t, "node"),
		SingleFactors: rapid.Bool().Draw(t, "single"),
	}
}

// Whatever the matrix and the options, M⁻¹ is a linear operator: M⁻¹(α·r + s) =
// α·M⁻¹r + M⁻¹s to rounding.
func TestApplyIsLinear(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, o := drawMatrix(t), drawOptions(t)
		kind := rapid.SampledFrom(Kinds()).Draw(t, "kind")
		p, report := build2(t, kind, a, o)
		r, s := vector(a.Rows, 3), vector(a.Rows, 4)
		both, sizes := make([]float64, a.Rows), make([]float64, a.Rows)
		for i := range both {
			both[i] = -2*r[i] + s[i]
			sizes[i] = 2*math.Abs(r[i]) + math.Abs(s[i])
		}
		zr, zs, zb := solved(p, r), solved(p, s), solved(p, both)
		bound := solved(majorant(p), sizes)
		for i := range zb {
			if d := math.Abs(zb[i] - (-2*zr[i] + zs[i])); !(d <= rounding*bound[i]) {
				t.Fatalf("%s (%s): entry %d of M⁻¹(−2r+s) is off by %.2e, numbers up to %.2e", kind, report.Kind, i, d, bound[i])
			}
		}
	})
}

// Whatever the matrix and the options, ⟨M⁻¹r, s⟩ = ⟨r, M⁻ᵀs⟩.
func TestTransposedIsAdjoint(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, o := drawMatrix(t), drawOptions(t)
		kind := rapid.SampledFrom(Kinds()).Draw(t, "kind")
		p, report := build2(t, kind, a, o)
		r, s := vector(a.Rows, 3), vector(a.Rows, 4)
		z, zt := solved(p, r), make([]float64, a.Rows)
		p.ApplyTransposed(zt, s)
		bound := dot(solved(majorant(p), absolute(r)), absolute(s))
		if d := math.Abs(dot(z, s) - dot(r, zt)); !(d <= rounding*bound) {
			t.Fatalf("%s (%s): ⟨M⁻¹r,s⟩ − ⟨r,M⁻ᵀs⟩ = %.2e, numbers up to %.2e", kind, report.Kind, d, bound)
		}
	})
}

// rounding covers some thousand operations one after the other, in units of the
// sum of the sizes of all that is added up.
const rounding = 4e3 * 0x1p-53

// majorant is the operator that adds up the sizes of whatever p adds: entries of
// L and U turned to −|·|, pivots to |·|. Rounding errors of p are a small multiple
// of what it returns for |r|.
func majorant(p Preconditioner) Preconditioner {
	switch p := p.(type) {
	case *rowwise:
		return &rowwise{rows: p.rows, inverse: absolute(p.inverse), cuts: p.cuts}
	case *factored[float64]:
		return majorantFactors(p)
	case *factored[float32]:
		return majorantFactors(p)
	}
	panic("no majorant of this kind")
}

func majorantFactors[F float32 | float64](p *factored[F]) Preconditioner {
	f := &factored[F]{rows: p.rows, parts: slices.Clone(p.parts)}
	for i := range f.parts {
		q := &f.parts[i]
		q.inverse = absolute(q.inverse)
		for _, t := range []*triangle[F]{&q.lower, &q.upper} {
			t.val = slices.Clone(t.val)
			for k, v := range t.val {
				t.val[k] = min(v, -v)
			}
		}
	}
	return f
}

// absolute is |v|, entry by entry; nil stays nil.
func absolute(v []float64) []float64 {
	out := slices.Clone(v)
	for i := range out {
		out[i] = math.Abs(out[i])
	}
	return out
}

// Whatever is interleaved with what, in whatever order the parts are built and
// applied, in place or not, the bits are the same.
func TestPartsGiveTheSameBits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, o := drawMatrix(t), drawOptions(t)
		kind := rapid.SampledFrom(Kinds()).Draw(t, "kind")
		p, report := build2(t, kind, a, o)
		r := vector(a.Rows, 3)
		want := solved(p, r)

		o.Interleave = rapid.IntRange(0, 5).Draw(t, "other interleave")
		o.Threads = rapid.IntRange(0, 9).Draw(t, "threads")
		o.Each = func(count int, do func(int)) {
			var all sync.WaitGroup
			for i := range count {
				all.Go(func() { do(count - 1 - i) })
			}
			all.Wait()
		}
		p2, report2 := build2(t, kind, a, o)
		if report2.Kind != report.Kind || report2.Blocks != report.Blocks {
			t.Fatalf("interleaved otherwise: %+v, want %+v", report2, report)
		}
		z := append([]float64(nil), r...)
		for part := p2.Parts() - 1; part >= 0; part-- {
			p2.ApplyPart(z, z, part)
		}
		if d := sameBits(z, want); d != "" {
			t.Fatalf("%s: %s", report.Kind, d)
		}
	})
}

// build2 is build for rapid's T.
func build2(t *rapid.T, kind string, a *csr.Matrix, o Options) (Preconditioner, Report) {
	p, r, err := Build(kind, a, o)
	if err != nil {
		t.Fatalf("Build(%q): %v", kind, err)
	}
	return p, r
}

func solved(p Preconditioner, r []float64) []float64 {
	z := make([]float64, len(r))
	p.Apply(z, r)
	return z
}

func TestOddMatrices(t *testing.T) {
	cases := []struct {
		name   string
		a      *csr.Matrix
		pivots int // of ilu0, -1: not looked at
	}{
		{"no rows", explicit(0), 0},
		{"one row", explicit(1, [3]float64{0, 0, 2}), 0},
		{"one empty row", explicit(1), 1},
		{"an empty row", explicit(3, [3]float64{0, 0, 1}, [3]float64{2, 2, 1}, [3]float64{2, 0, 1}), 1},
		{"a stored zero", explicit(2, [3]float64{0, 0, 0}, [3]float64{0, 1, 1}, [3]float64{1, 0, 1}, [3]float64{1, 1, 1}), 1},
		{"no diagonal", explicit(2, [3]float64{0, 1, 1}, [3]float64{1, 0, 1}), 1},
		{"singular", explicit(2, [3]float64{0, 0, 1}, [3]float64{0, 1, 1}, [3]float64{1, 0, 1}, [3]float64{1, 1, 1}), 1},
		{"only denormal numbers", explicit(2, [3]float64{0, 0, 5e-324}, [3]float64{1, 1, 5e-324}), -1},
		{"huge numbers", explicit(2, [3]float64{0, 0, 1e308}, [3]float64{0, 1, -1e308}, [3]float64{1, 0, 1e308}, [3]float64{1, 1, 1e308}), -1},
	}
	for _, c := range cases {
		for _, kind := range Kinds() {
			t.Run(c.name+"/"+kind, func(t *testing.T) {
				p, report := build(t, kind, c.a, Options{})
				if p.Parts() < 1 || p.Parts() != report.Parts || report.Asked != kind {
					t.Errorf("%d parts, report %+v", p.Parts(), report)
				}
				for i, v := range solved(p, vector(c.a.Rows, 1)) {
					if math.IsNaN(v) {
						t.Errorf("entry %d is not a number, report %+v", i, report)
					}
				}
				if c.pivots >= 0 && kind != None && kind != Diagonal && report.PivotCount != c.pivots {
					t.Errorf("%d replaced pivots, want %d: %+v", report.PivotCount, c.pivots, report)
				}
				if (report.Kind != kind) != (report.Reason != "") {
					t.Errorf("%s became %s because of %q", kind, report.Kind, report.Reason)
				}
			})
		}
	}
}

func TestReplacedPivotsAreNamed(t *testing.T) {
	// Rows 2 and 5 have no diagonal and nothing left of it.
	var tr csr.Triplets
	for i := range 8 {
		if i == 2 || i == 5 {
			tr.Add(i, i+1, 3)
			continue
		}
		tr.Add(i, i, 2)
	}
	for _, kind := range []string{Diagonal, ILU0} {
		_, report := build(t, kind, tr.Matrix(8, 8), Options{SubBlocks: 2})
		if report.Kind != kind || report.PivotCount != 2 || len(report.Pivots) != 2 || report.Pivots[0] != 2 || report.Pivots[1] != 5 {
			t.Errorf("%s: %+v, want pivots 2 and 5 replaced", kind, report)
		}
	}
}

func TestHaloColumnsAreLeftOut(t *testing.T) {
	a := plane5(12, 10, 0)
	wide := &csr.Matrix{Rows: 72, Cols: a.Cols, Start: a.Start[:73], Col: a.Col[:a.Start[72]], Val: a.Val[:a.Start[72]]}
	for _, kind := range Kinds() {
		p, report := build(t, kind, wide, Options{SubBlocks: 2})
		q, want := build(t, kind, diagonalBlock(a, 0, 72), Options{SubBlocks: 2})
		r := vector(72, 1)
		if d := sameBits(solved(p, r), solved(q, r)); d != "" || report.Fill != want.Fill {
			t.Errorf("%s with halo columns: %s, fill %v want %v", kind, d, report.Fill, want.Fill)
		}
	}
}

func TestRefusals(t *testing.T) {
	_, _, err := Build("cholesky", explicit(1), Options{})
	if err == nil || !strings.Contains(err.Error(), "cholesky") {
		t.Fatalf("unknown kind: %v", err)
	}
	for _, kind := range Kinds() {
		if !strings.Contains(err.Error(), kind) {
			t.Errorf("%q does not name the kind %s", err, kind)
		}
	}
	_, _, err = Build(ILU0, explicit(1), Options{Fill: -1, Drop: math.NaN(), Node: -2})
	for _, want := range []string{"fill is -1", "NaN", "node is -2"} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("bad options: %v, want %q", err, want)
		}
	}
	if _, _, err := Build(ILU0, &csr.Matrix{Rows: 2, Cols: 1, Start: []int{0, 0, 0}}, Options{}); err == nil {
		t.Error("a row block narrower than its rows was taken")
	}
}

func TestBlockCuts(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rows := rapid.OneOf(rapid.IntRange(0, 500), rapid.IntRange(0, 3_000_000)).Draw(t, "rows")
		o := Options{SubBlocks: rapid.IntRange(0, 20).Draw(t, "sub-blocks"), Node: rapid.IntRange(1, 6).Draw(t, "node")}
		cuts := blockCuts(rows, o)
		if cuts[0] != 0 || cuts[len(cuts)-1] != rows {
			t.Fatalf("blockCuts(%d, %+v) = %v", rows, o, cuts)
		}
		for b := 1; b < len(cuts)-1; b++ {
			if cuts[b] <= cuts[b-1] || cuts[b] >= rows || cuts[b]%o.Node != 0 {
				t.Fatalf("blockCuts(%d, %+v) = %v", rows, o, cuts)
			}
		}
	})
}

func TestPartsLeaveEveryThreadOne(t *testing.T) {
	for _, c := range []struct{ blocks, interleave, threads, parts int }{
		{8, 0, 0, 4}, {8, 0, 1, 2}, {8, 0, 2, 2}, {8, 0, 3, 4}, {8, 0, 4, 4}, {8, 0, 16, 8}, {8, 3, 1, 3}, {1, 0, 4, 1}, {16, 0, 2, 4},
	} {
		if got := len(partCuts(c.blocks, Options{Interleave: c.interleave, Threads: c.threads})) - 1; got != c.parts {
			t.Errorf("%+v: %d parts", c, got)
		}
	}
}

func TestSubBlocksFollowFromRows(t *testing.T) {
	for rows, want := range map[int]int{0: 1, 19_999: 1, 20_000: 4, 199_999: 4, 200_000: 8, 1_999_999: 8, 2_000_000: 16} {
		if got := len(blockCuts(rows, Options{Node: 1})) - 1; got != want {
			t.Errorf("%d rows: %d sub-blocks, want %d", rows, got, want)
		}
	}
}
