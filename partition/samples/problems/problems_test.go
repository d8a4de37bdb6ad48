package problems

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"math"
	"testing"

	"rowstead/partition/csr"
)

// digest is a checksum of the pattern and the bits of the values.
func digest(m *csr.Matrix) string {
	hash := sha256.New()
	var word [8]byte
	put := func(v uint64) {
		binary.LittleEndian.PutUint64(word[:], v)
		hash.Write(word[:])
	}
	put(uint64(m.Rows))
	put(uint64(m.Cols))
	for i := range m.Rows {
		cols, vals := m.Row(i)
		put(uint64(len(cols)))
		for k, c := range cols {
			put(uint64(c))
			put(math.Float64bits(vals[k]))
		}
	}
	return hex.EncodeToString(hash.Sum(nil)[:8])
}

// The matrices have the same bits on every processor: the digests were taken
// once. The deterministic ones were compared entry by entry with an independent
// program when they were taken.
func TestBitsAreFixed(t *testing.T) {
	for _, c := range []struct {
		name string
		m    *csr.Matrix
		want string
	}{
		{"upwind 2-D", ConvectionDiffusion2D(20, 100, 30, Upwind), "0491c03025670df6"},
		{"central 2-D", ConvectionDiffusion2D(20, 5000, 2000, Central), "0f7c34d04581e5aa"},
		{"recirculating", Recirculating2D(20, 200, Central), "f52bf146a818dffa"},
		{"upwind 3-D", ConvectionDiffusion3D(8, [3]float64{80, 20, 10}, Upwind), "bf444163bbe40d87"},
		{"Poisson", Poisson2D(20), "55645c4f1db3253b"},
		{"Helmholtz", Helmholtz2D(20, 0.05), "a51be9f14497fb72"},
		{"Grcar", Grcar(100, 3), "2227947d538cc1cd"},
		{"27-point", Stencil27(8), "9cb72780f996eb6b"},
		{"log-normal 2-D", LogNormal([]int{20, 30}, 5, 4, 1), "4c0b1493ed73806e"},
		{"log-normal 3-D", LogNormal([]int{8, 9, 10}, 6, 4, 1), "c5cbe42956ab3de8"},
		{"circuit", Circuit(500, 1), "bdaea1fb5f7882c4"},
		{"bad rows", BadRows(Poisson2D(20), 3, 1), "5b978cc31b7b853d"},
	} {
		if err := c.m.Check(); err != nil {
			t.Errorf("%s: %v", c.name, err)
		}
		if got := digest(c.m); got != c.want {
			t.Errorf("%s: digest %s, want %s", c.name, got, c.want)
		}
	}
}

// Inside the domain a row of a divergence-free or constant flow sums to zero:
// nothing is made or lost.
func TestInnerRowsSumToZero(t *testing.T) {
	const m = 12
	for name, a := range map[string]*csr.Matrix{
		"upwind":  ConvectionDiffusion2D(m, 100, -30, Upwind),
		"central": ConvectionDiffusion2D(m, 100, -30, Central),
		"Poisson": Poisson2D(m),
		"27":      Stencil27(m),
		"3-D":     ConvectionDiffusion3D(m, [3]float64{80, -20, 10}, Upwind),
	} {
		for i := range a.Rows {
			cols, vals := a.Row(i)
			if len(cols) < len(widest(a)) {
				continue
			}
			sum, size := 0.0, 0.0
			for _, v := range vals {
				sum, size = sum+v, size+math.Abs(v)
			}
			if math.Abs(sum) > 1e-14*size {
				t.Fatalf("%s: row %d sums to %v", name, i, sum)
			}
		}
	}
}

func widest(a *csr.Matrix) []int32 {
	var w []int32
	for i := range a.Rows {
		if cols, _ := a.Row(i); len(cols) > len(w) {
			w = cols
		}
	}
	return w
}

func symmetric(a *csr.Matrix) bool {
	b := a.Transpose()
	for k := range a.Val {
		if a.Col[k] != b.Col[k] || a.Val[k] != b.Val[k] {
			return false
		}
	}
	return a.Rows == a.Cols
}

func TestSymmetryIsExact(t *testing.T) {
	for _, c := range []struct {
		name string
		m    *csr.Matrix
		want bool
	}{
		{"Poisson", Poisson2D(15), true},
		{"Helmholtz", Helmholtz2D(15, 0.1), true},
		{"27-point", Stencil27(6), true},
		{"log-normal 2-D", LogNormal([]int{17, 20}, 5, 4, 2), true},
		{"log-normal 3-D", LogNormal([]int{6, 7, 8}, 6, 4, 2), true},
		{"upwind", ConvectionDiffusion2D(10, 1, 0, Upwind), false},
		{"circuit", Circuit(400, 3), false},
	} {
		if got := symmetric(c.m); got != c.want {
			t.Errorf("%s: symmetric %v, want %v", c.name, got, c.want)
		}
	}
}

// ±2 standard deviations of log₁₀ K span the decades asked for: the sample
// deviation of the field is 1 and neighbours are correlated as the filter says,
// exp(−1/(4·corr²)) = 0.984 for corr = 4.
func TestLogNormalFieldHasItsLaw(t *testing.T) {
	const m = 120
	f := smoothField([]int{m, m}, 4, 9)
	mean, square, pair := 0.0, 0.0, 0.0
	for _, v := range f {
		mean += v / float64(len(f))
	}
	for k, v := range f {
		square += (v - mean) * (v - mean) / float64(len(f))
		pair += (v - mean) * (f[(k+m)%len(f)] - mean) / float64(len(f))
	}
	if math.Abs(square-1) > 1e-12 || math.Abs(pair-math.Exp(-1.0/64)) > 0.005 {
		t.Errorf("variance %v, want 1; neighbour correlation %v, want %v ± 0.005", square, pair, math.Exp(-1.0/64))
	}
}

func TestCircuitHasHubsAndFiveDecades(t *testing.T) {
	a := Circuit(20000, 1)
	least, most, hub := math.Inf(1), 0.0, 0
	for i := range a.Rows {
		cols, vals := a.Row(i)
		hub = max(hub, len(cols))
		for k, c := range cols {
			if int(c) != i && vals[k] < 0 {
				least, most = min(least, -vals[k]), max(most, -vals[k])
			}
		}
	}
	if hub < 100 || most/least < 1e5 {
		t.Errorf("largest row %d entries, conductances over %.1e; want at least 100 and 1e5", hub, most/least)
	}
}
