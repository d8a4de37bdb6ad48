package order

import (
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// drawSquare draws a square matrix of whole numbers, at times in several
// components, at times with a symmetric pattern.
func drawSquare(t *rapid.T) *csr.Matrix {
	n := rapid.IntRange(0, 60).Draw(t, "rows")
	var entries csr.Triplets
	both := rapid.Bool().Draw(t, "symmetric")
	for range rapid.IntRange(0, 3*n).Draw(t, "entries") {
		i, j := rapid.IntRange(0, n-1).Draw(t, "i"), rapid.IntRange(0, n-1).Draw(t, "j")
		entries.Add(i, j, float64(rapid.IntRange(-9, 9).Draw(t, "v")))
		if both && i != j {
			entries.Add(j, i, float64(rapid.IntRange(-9, 9).Draw(t, "w")))
		}
	}
	return entries.Matrix(n, n)
}

// grid is the 7-point pattern of nx·ny·nz cells, its rows shuffled by seed
// unless that is 0.
func grid(nx, ny, nz int, seed uint64) *csr.Matrix {
	n := nx * ny * nz
	name := make([]int, n)
	for i := range name {
		name[i] = i
	}
	if seed != 0 {
		rand.New(rand.NewPCG(seed, 1)).Shuffle(n, func(i, j int) { name[i], name[j] = name[j], name[i] })
	}
	var entries csr.Triplets
	for c := range n {
		x, y, z := c%nx, c/nx%ny, c/(nx*ny)
		entries.Add(name[c], name[c], 6)
		for _, d := range [][3]int{{1, 0, 0}, {-1, 0, 0}, {0, 1, 0}, {0, -1, 0}, {0, 0, 1}, {0, 0, -1}} {
			if u, v, w := x+d[0], y+d[1], z+d[2]; u >= 0 && u < nx && v >= 0 && v < ny && w >= 0 && w < nz {
				entries.Add(name[c], name[u+nx*(v+ny*w)], -1)
			}
		}
	}
	return entries.Matrix(n, n)
}

// evenCut places blocks at equal rows, multiples of 8.
func evenCut(start []int, blocks int) []int {
	first, rows := []int{0}, len(start)-1
	for p := 1; p < blocks; p++ {
		if at := p * rows / blocks / 8 * 8; at > first[len(first)-1] {
			first = append(first, at)
		}
	}
	return append(first, rows)
}

// slowCuthillMcKee does the same from sets and whole sorts.
func slowCuthillMcKee(m *csr.Matrix) []int32 {
	near := make([][]int32, m.Rows)
	for i := range m.Rows {
		for j := range m.Rows {
			a, _ := m.Row(i)
			b, _ := m.Row(j)
			if i != j && (slices.Contains(a, int32(j)) || slices.Contains(b, int32(i))) {
				near[i] = append(near[i], int32(j))
			}
		}
	}
	less := func(i, j int32) int {
		if d := len(near[i]) - len(near[j]); d != 0 {
			return d
		}
		return int(i - j)
	}
	levels := func(root int32) [][]int32 {
		seen, all := map[int32]bool{root: true}, [][]int32{{root}}
		for {
			var next []int32
			for _, i := range all[len(all)-1] {
				for _, j := range near[i] {
					if !seen[j] {
						seen[j], next = true, append(next, j)
					}
				}
			}
			if next == nil {
				return all
			}
			all = append(all, next)
		}
	}
	placed, order := make([]bool, m.Rows), []int32{}
	for seed := range m.Rows {
		if placed[seed] {
			continue
		}
		root := int32(seed)
		old := levels(root)
		for range searches - 1 {
			root = slices.MinFunc(old[len(old)-1], less)
			now := levels(root)
			if len(now) <= len(old) {
				break
			}
			old = now
		}
		part := []int32{root}
		placed[root] = true
		for at := 0; at < len(part); at++ {
			children := slices.Clone(near[part[at]])
			slices.SortFunc(children, less)
			for _, j := range children {
				if !placed[j] {
					placed[j], part = true, append(part, j)
				}
			}
		}
		slices.Reverse(part)
		order = append(order, part...)
	}
	return order
}

// The fast reverse Cuthill-McKee order is the one of the obvious algorithm.
func TestCuthillMcKeeTwin(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := drawSquare(t)
		got := CuthillMcKee(m)
		Inverse(got) // panics unless a permutation
		if diff := cmp.Diff(slowCuthillMcKee(m), got); diff != "" {
			t.Fatalf("order −slow +fast:\n%s", diff)
		}
	})
}

func TestCuthillMcKeeOnShuffledGrids(t *testing.T) {
	cases := []struct {
		name       string
		nx, ny, nz int
		most       int // bandwidth: the rows of the widest diagonal of cells, and its neighbour's corner
	}{
		{"a line of 500", 500, 1, 1, 1},
		{"a strip of 400 by 5", 400, 5, 1, 6},
		{"a plate of 40 by 40", 40, 40, 1, 41},
		{"a bar of 60 by 6 by 6", 60, 6, 6, 42},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			m := grid(c.nx, c.ny, c.nz, 7)
			perm := CuthillMcKee(m)
			got := SpreadOf(Permute(m, perm), []int{0, m.Rows}).Bandwidth
			if got > c.most {
				t.Errorf("bandwidth %d, want at most %d", got, c.most)
			}
		})
	}
}

func TestReorderIsUsedOnlyWhereItPays(t *testing.T) {
	shuffled, natural := grid(30, 30, 1, 3), grid(30, 30, 1, 0)
	perm, before, after := Reorder(shuffled, 4, evenCut)
	if perm == nil || after.Halo > before.Halo/4 {
		t.Errorf("shuffled plate: perm %v, halo %d → %d", perm != nil, before.Halo, after.Halo)
	}
	if got := SpreadOf(Permute(shuffled, perm), evenCut(shuffled.Start, 4)); got != after {
		t.Errorf("after is %+v, but the permuted plate has %+v", after, got)
	}
	if perm, before, after := Reorder(natural, 4, evenCut); perm != nil || before != after || before.Halo != 6*30 {
		t.Errorf("plate in natural order: perm %v, %+v → %+v, want a halo of 180 kept", perm != nil, before, after)
	}
	if perm, before, _ := Reorder(shuffled, 1, evenCut); perm != nil || before.Halo != 0 {
		t.Errorf("one block: perm %v, halo %d", perm != nil, before.Halo)
	}
}

// Permuting moves every entry to where the permutation says, and vectors come
// back as they were.
func TestPermute(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := drawSquare(t)
		perm := make([]int32, m.Rows)
		for i := range perm {
			perm[i] = int32(i)
		}
		perm = rapid.Permutation(perm).Draw(t, "perm")
		p := Permute(m, perm)
		if err := p.Check(); err != nil {
			t.Fatal(err)
		}
		if p.Entries() != m.Entries() {
			t.Fatalf("%d entries, want %d", p.Entries(), m.Entries())
		}
		for i := range p.Rows {
			cols, vals := p.Row(i)
			for k, j := range cols {
				if want := m.At(int(perm[i]), int(perm[j])); vals[k] != want {
					t.Fatalf("entry (%d, %d) is %v, want %v", i, j, vals[k], want)
				}
			}
		}
		x := rapid.SliceOfN(rapid.Float64(), m.Rows, m.Rows).Draw(t, "x")
		y, back := make([]float64, m.Rows), make([]float64, m.Rows)
		PermuteVector(y, x, perm)
		Unpermute(back, y, perm)
		if diff := cmp.Diff(x, back); diff != "" {
			t.Fatalf("vector −want +got:\n%s", diff)
		}
	})
}

func TestPermuteSortsLongRows(t *testing.T) {
	const n = 100
	var entries csr.Triplets
	perm := make([]int32, n)
	for j := range n {
		entries.Add(0, j, float64(j))
		perm[j] = int32((37*j + 11) % n)
	}
	if err := Permute(entries.Matrix(n, n), perm).Check(); err != nil {
		t.Error(err)
	}
}

// Bandwidth, profile and halo are those of the definitions.
func TestSpreadTwin(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := drawSquare(t)
		first := evenCut(m.Start, rapid.IntRange(1, 6).Draw(t, "blocks"))
		var want Spread
		dense := func(i, j int) bool { cols, _ := m.Row(i); return slices.Contains(cols, int32(j)) }
		for i := range m.Rows {
			low := i
			for j := range m.Rows {
				if dense(i, j) || dense(j, i) {
					want.Bandwidth, low = max(want.Bandwidth, i-j, j-i), min(low, j)
				}
			}
			want.Profile += int64(i - low)
		}
		for p := range len(first) - 1 {
			need := map[int32]bool{}
			for _, c := range m.Col[m.Start[first[p]]:m.Start[first[p+1]]] {
				if int(c) < first[p] || int(c) >= first[p+1] {
					need[c] = true
				}
			}
			want.Halo += len(need)
		}
		if diff := cmp.Diff(want, SpreadOf(m, first)); diff != "" {
			t.Fatalf("−want +got:\n%s", diff)
		}
	})
}

func BenchmarkCuthillMcKee(b *testing.B) {
	for name, seed := range map[string]uint64{"natural": 0, "shuffled": 5} {
		m := grid(60, 60, 60, seed)
		b.Run(name, func(b *testing.B) {
			b.SetBytes(int64(4 * m.Entries()))
			for b.Loop() {
				CuthillMcKee(m)
			}
		})
	}
}
