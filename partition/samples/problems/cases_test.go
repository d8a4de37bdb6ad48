package problems

import (
	"math"
	"testing"
)

// Every case has its count, and the counts make sense: full orthogonalisation
// and the ladder are within a factor of two, except where they stand still.
func TestCountsBelongToCases(t *testing.T) {
	cases, counts, seen := Cases(), Counts(), map[string]bool{}
	if len(cases) != len(counts) {
		t.Fatalf("%d cases, %d counts", len(cases), len(counts))
	}
	for i, c := range cases {
		n := counts[i]
		if n.Name != c.Name || n.Precondition != c.Precondition || n.Blocks != c.Blocks {
			t.Errorf("case %d is %s, %s, %d blocks; its count says %s, %s, %d", i, c.Name, c.Precondition, c.Blocks, n.Name, n.Precondition, n.Blocks)
		}
		if key := c.Name + c.Precondition; seen[key] {
			t.Errorf("%s stands twice", key)
		} else {
			seen[key] = true
		}
		if ratio := float64(n.Ladder) / float64(n.Full); ratio < 0.5 || ratio > 2.1 {
			t.Errorf("%s: ladder %d, full %d", c.Name, n.Ladder, n.Full)
		}
	}
}

// The scaled system has a standard normal right side, whatever the rows' units.
func TestRightSideIsNormalInTheScaledNorm(t *testing.T) {
	a := BadRows(Poisson2D(60), 6, 4)
	b, square := Case{}.Right(a), 0.0
	for i, v := range b {
		_, vals := a.Row(i)
		largest := 0.0
		for _, w := range vals {
			largest = max(largest, math.Abs(w))
		}
		_, e := math.Frexp(largest)
		square += math.Pow(math.Ldexp(v, -e), 2)
	}
	if n := float64(len(b)); math.Abs(square/n-1) > 5*math.Sqrt(2/n) {
		t.Errorf("scaled right side has mean square %v, want 1", square/n)
	}
	ones := Case{Ones: true}.Right(Bidiagonal(4, 1, 2))
	for i, want := range []float64{3, 3, 3, 1} {
		if ones[i] != want {
			t.Errorf("b[%d] = %v, want %v", i, ones[i], want)
		}
	}
}
