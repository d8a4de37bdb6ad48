package partition

import (
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

// drawRows draws a square sparse matrix with ascending columns, as slices, and
// cuts of it.
func drawRows(t *rapid.T) (start []int, col []int32, val []float64, cuts RowCuts) {
	rows := rapid.IntRange(0, 120).Draw(t, "rows")
	start = make([]int, rows+1)
	if rows > 0 {
		column := rapid.SliceOfNDistinct(rapid.Int32Range(0, int32(rows-1)), 0, 9, rapid.ID)
		for i := range rows {
			columns := column.Draw(t, "columns")
			slices.Sort(columns)
			col = append(col, columns...)
			start[i+1] = len(col)
		}
	}
	for range col {
		val = append(val, rapid.Float64Range(-1, 1).Draw(t, "value"))
	}
	cuts, err := CutByEntries(start, rapid.IntRange(1, 9).Draw(t, "blocks"))
	if err != nil {
		t.Fatal(err)
	}
	return start, col, val, cuts
}

func planOf(cuts RowCuts, start []int, col []int32) *HaloPlan {
	needs := make([][]int32, cuts.Blocks())
	for p := range needs {
		lo, hi := cuts.Range(p)
		needs[p] = Needs(lo, start[lo:hi+1], col)
	}
	return PlanHalo(cuts, needs)
}

// Needs are the columns outside the own rows that a set would collect.
func TestNeedsAreTheDistinctOutsideColumns(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		start, col, _, cuts := drawRows(t)
		for p := range cuts.Blocks() {
			lo, hi := cuts.Range(p)
			var want []int32
			for _, c := range col[start[lo]:start[hi]] {
				if int(c) < lo || int(c) >= hi {
					want = append(want, c)
				}
			}
			slices.Sort(want)
			want = slices.Compact(want)
			if got := Needs(lo, start[lo:hi+1], col); !slices.Equal(got, want) {
				t.Fatalf("block %d: Needs = %v, want %v", p, got, want)
			}
		}
	})
}

// Every needed column is received exactly once and from its owner, and what a
// block sends is, entry by entry, what the receiver stores.
func TestPlanDeliversEveryNeedOnce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		start, col, _, cuts := drawRows(t)
		plan := planOf(cuts, start, col)
		lists := 0
		for p := range plan.Blocks {
			b := &plan.Blocks[p]
			at, peer := 0, -1
			for _, r := range b.Receive {
				if r.Lo != at || r.Hi <= r.Lo || r.Peer <= peer || r.Peer == p {
					t.Fatalf("block %d receives %v", p, b.Receive)
				}
				at, peer = r.Hi, r.Peer
				first := cuts.First(r.Peer)
				var sent []int32
				for _, s := range plan.Blocks[r.Peer].Send {
					if s.Peer == p {
						sent = append(sent, s.LocalRows...)
					}
				}
				stored := slices.Clone(b.Columns[r.Lo:r.Hi])
				for k := range stored {
					if cuts.Owner(int(stored[k])) != r.Peer {
						t.Fatalf("column %d does not belong to block %d", stored[k], r.Peer)
					}
					stored[k] -= int32(first)
				}
				if diff := cmp.Diff(stored, sent); diff != "" {
					t.Fatalf("from %d to %d −stored +sent:\n%s", r.Peer, p, diff)
				}
				lists++
			}
			if at != len(b.Columns) {
				t.Fatalf("block %d receives %d of %d halo entries", p, at, len(b.Columns))
			}
		}
		for p := range plan.Blocks {
			lists -= len(plan.Blocks[p].Send)
			if !slices.IsSortedFunc(plan.Blocks[p].Send, func(a, b Send) int { return a.Peer - b.Peer }) {
				t.Fatalf("block %d sends to peers out of order", p)
			}
		}
		if lists != 0 {
			t.Fatalf("%d lists are received more than sent", lists)
		}
	})
}

// A sum over a row has the same terms in the same order in local columns, and
// the own and the halo columns of a row ascend among themselves.
func TestLocalizeKeepsTheOrderOfARow(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		start, col, val, cuts := drawRows(t)
		plan := planOf(cuts, start, col)
		for p := range plan.Blocks {
			lo, hi := cuts.Range(p)
			halo := plan.Blocks[p].Columns
			local := Localize(lo, halo, start[lo:hi+1], col, val)
			if local.Rows != hi-lo || local.Halo != len(halo) || local.Start[local.Rows] != len(local.Col) {
				t.Fatalf("block %d: %d rows, %d halo entries, ends at %d", p, local.Rows, local.Halo, local.Start[local.Rows])
			}
			for i := range local.Rows {
				ownLast, haloLast := -1, -1
				for k := local.Start[i]; k < local.Start[i+1]; k++ {
					global, c := start[lo+i]+k-local.Start[i], int(local.Col[k])
					back := c + lo
					if c >= local.Rows {
						back = int(halo[c-local.Rows])
						if c <= haloLast {
							t.Fatalf("row %d: halo columns descend", lo+i)
						}
						haloLast = c
					} else {
						if c <= ownLast {
							t.Fatalf("row %d: own columns descend", lo+i)
						}
						ownLast = c
					}
					if back != int(col[global]) || local.Val[k] != val[global] {
						t.Fatalf("row %d: entry %d is column %d value %v, want %d and %v", lo+i, k, back, local.Val[k], col[global], val[global])
					}
				}
			}
		}
	})
}

func TestOneBlockHasNoHalo(t *testing.T) {
	cuts, err := EvenCuts(3, 1)
	if err != nil {
		t.Fatal(err)
	}
	plan := planOf(cuts, []int{0, 1, 2, 3}, []int32{2, 0, 1})
	b := plan.Blocks[0]
	if len(b.Columns)+len(b.Receive)+len(b.Send) != 0 || plan.Volume().Bytes != 0 {
		t.Errorf("one block has the halo %+v", b)
	}
}

func TestVolumeOfALine(t *testing.T) {
	const rows = 64
	start, col := make([]int, rows+1), []int32{}
	for i := range rows {
		for _, j := range []int{i - 1, i, i + 1} {
			if j >= 0 && j < rows {
				col = append(col, int32(j))
			}
		}
		start[i+1] = len(col)
	}
	cuts, err := EvenCuts(rows, 4)
	if err != nil {
		t.Fatal(err)
	}
	want := Volume{Entries: []int{1, 2, 2, 1}, Sent: []int{1, 2, 2, 1}, Total: 6, Share: 6. / 64, Largest: 2. / 48, Bytes: 48}
	if diff := cmp.Diff(want, planOf(cuts, start, col).Volume()); diff != "" {
		t.Errorf("Volume of a line in 4 blocks −want +got:\n%s", diff)
	}
}

func TestCheckNeedsNamesTheBlock(t *testing.T) {
	cuts, err := EvenCuts(16, 2)
	if err != nil {
		t.Fatal(err)
	}
	cases := []struct {
		name  string
		needs [][]int32
		fault string
	}{
		{"a block is missing", [][]int32{nil}, "needs of 1 row blocks"},
		{"own column", [][]int32{{3}, nil}, "row block 0 needs its own column 3"},
		{"outside", [][]int32{nil, {7, 16}}, "row block 1 needs column 16 of 16"},
		{"negative", [][]int32{{-1}, nil}, "row block 0 needs column -1"},
		{"twice", [][]int32{{9, 9}, nil}, "column 9 after 9"},
	}
	for _, c := range cases {
		if err := CheckNeeds(cuts, c.needs); err == nil || !strings.Contains(err.Error(), c.fault) {
			t.Errorf("%s: CheckNeeds error %v, want %q", c.name, err, c.fault)
		}
	}
	if err := CheckNeeds(cuts, [][]int32{{8, 15}, {0}}); err != nil {
		t.Errorf("CheckNeeds of good needs: %v", err)
	}
}
