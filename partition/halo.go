package partition

import "fmt"

// HaloPlan is who needs which entries of x of whom, for A·x; read backwards it
// is who owes which contributions to whom, for Aᵀ·x. Block p's part stands
// alone: Blocks[p] is all that the worker of block p must know.
type HaloPlan struct {
	Cuts   RowCuts
	Blocks []BlockHalo
}

// BlockHalo is one block's part of a HaloPlan. Peers ascend in both lists and
// never name the block itself.
type BlockHalo struct {
	Block   int
	Rows    int       // own rows
	Columns []int32   // global columns of the halo, ascending: its order in memory
	Receive []Receive // together they cover Columns, in order
	Send    []Send
}

// Receive says that peer owns the halo entries [Lo, Hi).
type Receive struct {
	Peer, Lo, Hi int
}

// Send lists the own rows, local and ascending, whose entries of x peer needs,
// in the order in which peer stores them.
type Send struct {
	Peer      int
	LocalRows []int32
}

// CheckNeeds returns an error that names the first block whose needs PlanHalo
// would not accept: needs that do not ascend strictly, lie outside the matrix,
// or are the block's own rows. For needs that come from elsewhere.
func CheckNeeds(cuts RowCuts, needs [][]int32) error {
	if len(needs) != cuts.Blocks() {
		return fmt.Errorf("halo: needs of %d row blocks; there are %d", len(needs), cuts.Blocks())
	}
	for p, columns := range needs {
		lo, hi := cuts.Range(p)
		last := -1
		for _, c := range columns {
			column := int(c)
			switch {
			case column <= last:
				return fmt.Errorf("halo: row block %d needs column %d after %d", p, column, last)
			case column >= cuts.Rows():
				return fmt.Errorf("halo: row block %d needs column %d of %d", p, column, cuts.Rows())
			case column >= lo && column < hi:
				return fmt.Errorf("halo: row block %d needs its own column %d", p, column)
			}
			last = column
		}
	}
	return nil
}

// PlanHalo makes the plan from what each block needs: needs[p] is the ascending
// columns outside block p's own rows that its rows touch (Needs). The plan
// keeps the slices of needs. It panics where CheckNeeds finds an error.
// O(blocks² + all needs).
func PlanHalo(cuts RowCuts, needs [][]int32) *HaloPlan {
	if CheckNeeds(cuts, needs) != nil {
		panic("partition: PlanHalo of needs that CheckNeeds refuses")
	}
	plan := &HaloPlan{Cuts: cuts, Blocks: make([]BlockHalo, cuts.Blocks())}
	for p := range plan.Blocks {
		lo, hi := cuts.Range(p)
		plan.Blocks[p] = BlockHalo{Block: p, Rows: hi - lo, Columns: needs[p]}
	}
	for p, columns := range needs {
		at := 0
		for owner := 0; at < len(columns); owner++ {
			lo, hi := cuts.Range(owner)
			from := at
			for at < len(columns) && int(columns[at]) < hi {
				at++
			}
			if at == from {
				continue
			}
			receiver, sender := &plan.Blocks[p], &plan.Blocks[owner]
			receiver.Receive = append(receiver.Receive, Receive{Peer: owner, Lo: from, Hi: at})
			sender.Send = append(sender.Send, Send{Peer: p, LocalRows: shifted(columns[from:at], lo)})
		}
	}
	return plan
}

func shifted(columns []int32, lo int) []int32 {
	local := make([]int32, len(columns))
	for k, c := range columns {
		local[k] = c - int32(lo)
	}
	return local
}

// Volume is what the halos of one product weigh.
type Volume struct {
	Entries []int   // halo entries each block receives
	Sent    []int   // entries each block sends, an entry once a receiver
	Total   int     // Σ Entries
	Share   float64 // Total / rows; 0.02 is a thin halo, 1 sends x around once
	Largest float64 // the largest share of all columns outside a block in its halo
	Bytes   int64   // that one product moves between blocks, 8 an entry
}

// Volume counts the halos of one product.
func (p *HaloPlan) Volume() Volume {
	v := Volume{Entries: make([]int, len(p.Blocks)), Sent: make([]int, len(p.Blocks))}
	rows := p.Cuts.Rows()
	for k := range p.Blocks {
		b := &p.Blocks[k]
		v.Entries[k] = len(b.Columns)
		v.Total += len(b.Columns)
		for _, s := range b.Send {
			v.Sent[k] += len(s.LocalRows)
		}
		if outside := rows - b.Rows; outside > 0 {
			v.Largest = max(v.Largest, float64(len(b.Columns))/float64(outside))
		}
	}
	if rows > 0 {
		v.Share = float64(v.Total) / float64(rows)
	}
	v.Bytes = 8 * int64(v.Total)
	return v
}
