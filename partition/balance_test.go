package partition

import (
	"math"
	"slices"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

// drawStarts draws the row starts of a matrix with very uneven rows.
func drawStarts(t *rapid.T) []int {
	counts := rapid.SliceOfN(rapid.OneOf(rapid.IntRange(0, 9), rapid.IntRange(0, 3000)), 0, 300).Draw(t, "entries")
	start := make([]int, len(counts)+1)
	for i, n := range counts {
		start[i+1] = start[i] + n
	}
	return start
}

// A cutting has between one and the wanted number of blocks, none of them empty
// while there are rows, each beginning at a multiple of lcm(8, group), and as
// many as there can be.
func checkShape(t *rapid.T, c RowCuts, rows, wanted, group int) {
	unit := Unit
	for unit%max(1, group) != 0 {
		unit += Unit
	}
	if c.Rows() != rows || c.Wanted() != wanted || c.Blocks() != max(1, min(wanted, (rows+unit-1)/unit)) {
		t.Fatalf("cuts of %d rows by %d: %d rows, wanted %d, blocks %d of %d", rows, unit, c.Rows(), c.Wanted(), c.Blocks(), wanted)
	}
	next := 0
	for p := range c.Blocks() {
		lo, hi := c.Range(p)
		if lo != next || lo%unit != 0 || (hi <= lo && rows > 0) {
			t.Fatalf("block %d is [%d, %d), want it to begin at %d, a multiple of %d", p, lo, hi, next, unit)
		}
		next = hi
	}
	if next != rows {
		t.Fatalf("blocks end at %d of %d", next, rows)
	}
	if row, splits := c.Splits(group); splits {
		t.Fatalf("cut at %d splits a group of %d", row, group)
	}
}

func TestCutByEntriesKeepsShapeAndBalance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		start := drawStarts(t)
		rows, blocks := len(start)-1, rapid.IntRange(1, 40).Draw(t, "blocks")
		rule := Rule{RowWeight: rapid.IntRange(-1, 9).Draw(t, "weight"), Group: rapid.IntRange(0, 7).Draw(t, "group")}
		c, err := rule.CutByEntries(start, blocks)
		if err != nil {
			t.Fatal(err)
		}
		checkShape(t, c, rows, blocks, rule.Group)
		checkBalance(t, c, rule, start, equal(c.Blocks()))
	})
}

// While nothing forces a block to be wider, no block exceeds its share by more
// than the heaviest unit.
func checkBalance(t *rapid.T, c RowCuts, rule Rule, start []int, share []float64) {
	rows, work := c.Rows(), rule.work(start)
	unit, _ := rule.check(start)
	heaviest, sum := 0.0, 0.0
	for row := 0; row < rows; row += unit {
		heaviest = max(heaviest, float64(work(min(row+unit, rows))-work(row)))
	}
	for _, s := range share {
		sum += s
	}
	for p := range c.Blocks() {
		lo, hi := c.Range(p)
		got, want := float64(work(hi)-work(lo)), float64(work(rows))*share[p]/sum
		if got > want+heaviest+1e-9*want && hi-lo > unit {
			// widened: a neighbour must then be a single unit
			alone := func(q int) bool {
				return q >= 0 && q < c.Blocks() && c.First(q+1)-c.First(q) <= unit
			}
			if !alone(p-1) && !alone(p+1) {
				t.Fatalf("block %d of %v has work %v, share %v, heaviest unit %v", p, c.Starts(), got, want, heaviest)
			}
		}
	}
}

func TestCutBySpeedFollowsSpeeds(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		start := drawStarts(t)
		speeds := rapid.SliceOfN(rapid.Float64Range(1e-3, 1e3), 1, 12).Draw(t, "speeds")
		rule := Rule{Group: rapid.IntRange(0, 7).Draw(t, "group")}
		c, kept, err := rule.CutBySpeed(start, speeds)
		if err != nil {
			t.Fatal(err)
		}
		checkShape(t, c, len(start)-1, len(speeds), rule.Group)
		if len(kept) != c.Blocks() || !slices.IsSorted(kept) {
			t.Fatalf("kept %v for %d blocks", kept, c.Blocks())
		}
		share := make([]float64, len(kept))
		for p, k := range kept {
			share[p] = speeds[k]
		}
		for k, s := range speeds {
			if !slices.Contains(kept, k) && s > slices.Min(share) {
				t.Fatalf("speed %v left out of %v, kept %v", s, speeds, kept)
			}
		}
		checkBalance(t, c, rule, start, share)
	})
}

func TestCutBySpeedGivesThreeQuartersToTheFastOne(t *testing.T) {
	start := make([]int, 8001)
	for i := range start {
		start[i] = 7 * i
	}
	c, kept, err := CutBySpeed(start, []float64{1.5e308, 0.5e308})
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]int{0, 6000}, c.Starts()); diff != "" || len(kept) != 2 {
		t.Errorf("CutBySpeed 3:1 of 8000 rows, kept %v: %s", kept, diff)
	}
}

func TestEvenCuts(t *testing.T) {
	cases := []struct {
		name         string
		rows, blocks int
		want         []int
	}{
		{"whole", 100, 1, []int{0}},
		{"even", 64, 4, []int{0, 16, 32, 48}},
		{"a short last block", 35, 2, []int{0, 16}},
		{"fewer rows than blocks", 20, 8, []int{0, 8, 16}},
		{"one row", 1, 4, []int{0}},
		{"no rows", 0, 4, []int{0}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			got, err := EvenCuts(c.rows, c.blocks)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(c.want, got.Starts()); diff != "" {
				t.Errorf("EvenCuts(%d, %d) −want +got:\n%s", c.rows, c.blocks, diff)
			}
		})
	}
}

func TestOwnerIsTheBlockWhoseRangeHoldsTheRow(t *testing.T) {
	c, err := CutByEntries(make([]int, 100), 5)
	if err != nil {
		t.Fatal(err)
	}
	for row := range c.Rows() {
		p := c.Owner(row)
		if lo, hi := c.Range(p); row < lo || row >= hi {
			t.Fatalf("Owner(%d) = %d with rows [%d, %d)", row, p, lo, hi)
		}
	}
}

func TestCutsRefuse(t *testing.T) {
	start := []int{0, 3, 6}
	bad := map[string]error{}
	_, bad["no blocks"] = CutByEntries(start, 0)
	_, bad["negative rows"] = EvenCuts(-1, 2)
	_, bad["no even blocks"] = EvenCuts(9, 0)
	_, bad["descending starts"] = CutByEntries([]int{0, 3, 2}, 2)
	_, bad["no starts"] = CutByEntries(nil, 2)
	_, bad["negative group"] = Rule{Group: -3}.CutByEntries(start, 2)
	_, _, bad["no speeds"] = CutBySpeed(start, nil)
	for name, s := range map[string]float64{"zero": 0, "negative": -1, "infinite": math.Inf(1), "not a number": math.NaN()} {
		_, _, bad[name+" speed"] = CutBySpeed(start, []float64{1, s})
	}
	for name, err := range bad {
		if err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}
