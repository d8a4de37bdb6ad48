package coordinator

import (
	"errors"
	"fmt"
	"os"
	"runtime"
	"strings"

	"rowstead/coordinator/method"
	"rowstead/coordinator/report"
	"rowstead/partition"
	"rowstead/partition/matfile"
	"rowstead/partition/order"
)

// plan is how a system is ordered, cut and preconditioned.
type plan struct {
	perm         []int32 // new row i is old row perm[i]; nil: as in the file
	cuts         partition.RowCuts
	precondition string
	conjugate    bool // prepare for conjugate gradients first
	form         form
	// spared says that the memory left conjugate gradients alone.
	spared bool
}

// strongly is the share of the bandwidth that must remain at most for a new
// order to be worth its trouble with a single block.
const strongly = 0.5

// chooseOrder puts neighbours near each other where that shrinks the halo or,
// in one block, the couplings that the preconditioner leaves out.
func (r *runner) chooseOrder(p *plan) error {
	m := r.sys.matrix
	blocks := max(1, r.job.Blocks)
	r.chooseBase()
	if r.job.Cuts != "" {
		return r.readCuts(p)
	}
	var failed error
	cut := func(start []int, blocks int) []int {
		c, err := partition.CutByEntries(start, blocks)
		if err != nil {
			failed = err
			return []int{0, len(start) - 1}
		}
		return append(c.Starts(), c.Rows())
	}
	var before, after order.Spread
	if blocks > 1 {
		p.perm, before, after = order.Reorder(m, blocks, cut)
		if p.perm != nil {
			r.choose("order", "reversed", fmt.Sprintf("reverse Cuthill-McKee takes the halo from %d to %d entries; undone in the answer", before.Halo, after.Halo), false)
		}
	} else if p.precondition == "ilu0" || p.precondition == "ilut" {
		whole := []int{0, m.Rows}
		perm := order.CuthillMcKee(m)
		before, after = order.SpreadOf(m, whole), order.SpreadOf(order.Permute(m, perm), whole)
		if float64(after.Bandwidth) <= strongly*float64(before.Bandwidth) {
			p.perm = perm
			r.choose("order", "reversed", fmt.Sprintf("reverse Cuthill-McKee takes the bandwidth from %d to %d; undone in the answer", before.Bandwidth, after.Bandwidth), false)
		}
	}
	if p.perm != nil {
		r.sys.matrix = order.Permute(m, p.perm)
	} else {
		r.choose("order", "as in file", "reordering gains too little", false)
	}
	if failed != nil {
		return failed
	}
	var err error
	p.cuts, err = partition.CutByEntries(r.sys.matrix.Start, blocks)
	return err
}

// chooseBase notes an index base that the matrix has no use for.
func (r *runner) chooseBase() {
	if format := r.sys.head.Format; r.job.IndexBase != matfile.UnknownBase && format != "triplets" {
		r.choose("index-base", "its own", "a file of the format "+format+" says itself from where it counts", true)
	}
}

// readCuts takes the blocks from a file; the order then stays that of the
// matrix, which the cuts refer to.
func (r *runner) readCuts(p *plan) error {
	f, err := os.Open(r.job.Cuts)
	if err != nil {
		return reading(r.job.Cuts, err)
	}
	defer f.Close() // read only
	p.cuts, err = partition.ReadCuts(f, r.sys.matrix.Rows)
	if err != nil {
		return &InputError{fmt.Sprintf("%s: %v", r.job.Cuts, err)}
	}
	r.choose("order", "as in file", "the cuts refer to it", false)
	return nil
}

// weak is the share of rows without a diagonal above which a factorisation by
// rows is not tried.
const weak = 0.01

// choosePreconditioner takes block ILU(0) where there is a diagonal to divide
// by.
func (r *runner) choosePreconditioner(p *plan, d order.Diagonal) {
	if !automatic(r.job.Precondition) {
		p.precondition = r.job.Precondition
		return
	}
	gaps := d.Missing.Count + d.Zero.Count
	if float64(gaps) > weak*float64(r.sys.matrix.Rows) {
		p.precondition = "none"
		r.why["precondition"] = fmt.Sprintf("%d of %d rows have nothing on the diagonal to divide by", gaps, r.sys.matrix.Rows)
		return
	}
	p.precondition = "ilu0"
	r.why["precondition"] = "the diagonal is there: incomplete LU on the pattern of the matrix"
}

// chooseConjugate tries conjugate gradients first where the matrix is symmetric
// to the last bit and its diagonal does not contradict that it is definite.
func (r *runner) chooseConjugate(p *plan, d order.Diagonal) error {
	if r.job.Method != method.CG && !automatic(r.job.Method) {
		return nil
	}
	symmetry := order.SymmetryOf(r.sys.matrix)
	if r.job.Method == method.CG {
		p.conjugate = true
		if !symmetry.Exact && !symmetry.Rounded {
			return &InputError{fmt.Sprintf("--method cg needs a symmetric matrix; the entries (%d, %d) and (%d, %d) differ",
				symmetry.Row+1, symmetry.Column+1, symmetry.Column+1, symmetry.Row+1)}
		}
		return nil
	}
	p.conjugate = symmetry.Exact && d.Negative.Count == 0 && d.Zero.Count == 0 && d.Missing.Count == 0
	if r.need.method == method.CG {
		return r.onlyConjugate(p)
	}
	return nil
}

// onlyConjugate takes conjugate gradients for good where nothing else fits the
// memory, or refuses where the matrix is not made for them.
func (r *runner) onlyConjugate(p *plan) error {
	any := r.need
	any.method = Auto
	_, _, err := any.fitBasis(r.job, r.most)
	if err == nil {
		return nil
	}
	if !p.conjugate {
		return err
	}
	r.job.Method, p.spared = method.CG, true
	var fit *FitError
	if errors.As(err, &fit) {
		r.why["method"] = fmt.Sprintf("the matrix is symmetric, and what keeps a basis takes %s at the least", bytesText(fit.Need))
	}
	return nil
}

// correct puts the reasons of choices right that the run itself has overtaken.
func (r *runner) correct() {
	for i := range r.rec.Choices {
		c := &r.rec.Choices[i]
		switch {
		case c.Name == "method" && r.plan.spared:
			c.Asked, c.Reason = false, r.why["method"]
		case c.Name == "sketch" && c.Asked:
			// What is said of the usual length does not hold.
			if _, rest, found := strings.Cut(c.Reason, "; "); found {
				c.Reason = rest
			}
		case c.Name == "precondition":
			r.fellBack(c)
		case c.Name == "threads" && r.job.Threads > runtime.NumCPU():
			c.Reason = fmt.Sprintf("more than the %d cores there are", runtime.NumCPU())
		}
	}
	if r.plan.spared && r.rec.Verdict == report.Short && r.rec.Reason != ReasonInterrupted && r.rec.Reason != ReasonTime {
		r.rec.Advice = "more --memory, so that other methods than conjugate gradients fit"
	}
}

// fellBack gives a preconditioner that could not be built as planned the reason
// for that alone.
func (r *runner) fellBack(c *report.Choice) {
	for k, f := range r.placed.Factors() {
		if f.Reason == "" || f.Kind == r.plan.precondition {
			continue
		}
		c.Reason = fmt.Sprintf("%s was planned; block %d: %s", r.plan.precondition, k+1, f.Reason)
		return
	}
}
