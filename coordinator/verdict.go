package coordinator

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"rowstead/coordinator/method"
	"rowstead/coordinator/report"
)

// check recomputes the residuals of the answer, takes the verdict from them
// alone, and keeps the answer in the order of the file.
func (r *runner) check(ctx context.Context, last method.Result, side *report.Side) error {
	x, exact, err := r.answer(ctx)
	if err != nil {
		return err
	}
	if !exact { // the verdict is on what can be written down
		if err := r.setGuess(ctx, x); err != nil {
			return err
		}
	}
	res, err := r.placed.Check(ctx)
	if err != nil {
		return err
	}
	side.Products++
	side.Residuals = r.residuals(res)
	side.Residuals.ConditionHint, side.Residuals.ForwardError = hint(last.ConditionHint), hint(last.ForwardError)
	if last.ConditionHint <= 1 || r.sys.balanced || len(r.sys.empty) > 0 || !exact {
		// Nothing was found, or x is not the only answer.
		side.Residuals.ForwardError = report.Unknown()
	}
	side.Verdict, side.Reason = report.Short, last.Reason
	switch {
	case res.Met(r.job.Tolerance):
		side.Verdict, side.Reason = report.Met, ""
	case !exact:
		side.Reason, r.rec.Advice = reasonRange, "write the equations in other units"
	case side.Reason == "":
		side.Reason = method.ReasonStagnated
		fallthrough
	default:
		r.explain(res, side)
	}
	if finite(x) {
		r.x[r.column] = x
	}
	return nil
}

// hint is a number that is zero when it is not known.
func hint(v float64) report.Number {
	if v == 0 {
		return report.Unknown()
	}
	return report.Number(v)
}

func finite(x []float64) bool {
	for _, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

// residuals puts the recomputed residuals into the record's form, with rows as
// the file counts them.
func (r *runner) residuals(res method.Residuals) report.Residuals {
	out := report.Residuals{
		True: report.Number(res.TrueResidual()), Scaled: report.Number(res.ScaledResidual()),
		RowWise: report.Number(res.RowWise), Backward: report.Number(res.BackwardError()),
	}
	for _, w := range res.Worst {
		out.Worst = append(out.Worst, report.Row{Row: r.fileRow(w.Row), Error: report.Number(w.Error)})
	}
	return out
}

// fileRow is the row of the file for a row of the blocks.
func (r *runner) fileRow(row int) int {
	if r.plan.perm != nil {
		row = int(r.plan.perm[row])
	}
	if r.sys.complex {
		row /= 2
	}
	return row
}

// explain sharpens the reason of a short side and says what to try.
func (r *runner) explain(res method.Residuals, side *report.Side) {
	why := r.sys.contradiction(r.sys.right[side.Column], r.job.Tolerance)
	if why != "" && side.Reason != ReasonInterrupted && side.Reason != ReasonTime {
		side.Reason = method.ReasonContradictory
		r.rec.Advice = why
		return
	}
	r.rec.Advice = advice(side.Reason, res, r.job, r.plan)
}

// rowsText names up to four rows as files count them.
func rowsText(rows []int) string {
	names := make([]string, 0, 4)
	for _, row := range rows[:min(4, len(rows))] {
		names = append(names, fmt.Sprint(row+1))
	}
	text := "row " + names[0]
	if len(names) > 1 {
		text = "rows " + strings.Join(names, ", ")
	}
	if len(rows) > len(names) {
		text += fmt.Sprintf(" and %d more", len(rows)-len(names))
	}
	return text
}

// advice says what to try after a reason.
func advice(reason string, res method.Residuals, j Job, p plan) string {
	switch reason {
	case method.ReasonContradictory:
		return "no x can satisfy these equations together; look for a missing fixed value (all flux boundaries) or a row that was written twice"
	case method.ReasonFloor:
		if !finite([]float64{res.TrueFloor, res.ScaledFloor, res.True, res.Scaled}) {
			return "the numbers leave the range of 64-bit floats; write the equations in other units"
		}
		floor := max(res.TrueFloor/max(res.Right, math.SmallestNonzeroFloat64), res.ScaledFloor/max(res.ScaledRight, math.SmallestNonzeroFloat64))
		return fmt.Sprintf("with an x of this size rounding alone may leave %.0e in 64-bit numbers; a looser tolerance, or units that are less far apart", floor)
	case method.ReasonIndefinite:
		return "the matrix is not positive definite; leave --method to the program"
	case ReasonInterrupted:
		return "carry on with rowstead resume"
	case ReasonTime, method.ReasonProducts:
		return "carry on with rowstead resume, or allow more"
	case method.ReasonNotFinite:
		return "the numbers left the range of 64-bit floats; look for entries that are far too large"
	}
	var tries []string
	if p.precondition != "ilut" && j.Precondition != "ilut" {
		tries = append(tries, "--precondition ilut")
	}
	if len(p.cuts.Starts()) > 1 {
		tries = append(tries, "fewer --blocks")
	}
	if j.Cycle > 0 || p.form.cycle < usualCycle {
		tries = append(tries, "a longer --cycle (more --memory)")
	}
	tries = append(tries, "a look at the worst rows of the report")
	return strings.Join(tries, "; ")
}

// tellChoices records how the run was carried out in the end.
func (r *runner) tellChoices() {
	last := r.rec.Sides[len(r.rec.Sides)-1]
	if r.why["method"] == "" && last.Method == method.CG {
		r.why["method"] = "the matrix is symmetric and nothing contradicts that it is definite"
	}
	r.choose("method", last.Method, r.why["method"], !automatic(r.job.Method))
	r.rec.Precondition = r.factored()
	r.choose("precondition", r.rec.Precondition, r.why["precondition"], !automatic(r.job.Precondition))
	if k := r.placed.longest; k.Capacity > 0 {
		r.rec.Basis = string(k.Form)
		r.choose("cycle", fmt.Sprint(k.Capacity-1), r.cycleReason(), r.job.Cycle > 0)
		r.choose("basis", string(k.Form), r.why["basis"], !automatic(r.job.Basis))
		if k.SketchRows > 0 {
			r.choose("sketch", fmt.Sprintf("%d rows", k.SketchRows), fmt.Sprintf("four times the longest cycle and what is kept; %d nonzeros a row, seed %d", k.Zeta, r.job.Seed), r.job.SketchRows > 0)
			r.choose("window", fmt.Sprint(k.Window), "enough for a well-conditioned basis on most problems", r.job.Window > 0)
		}
	}
	r.choose("threads", fmt.Sprint(r.job.Threads), "", r.threads)
	arrange(r.rec.Choices)
}

// cycleReason says why the cycle is as long as it is.
func (r *runner) cycleReason() string {
	if r.harder && r.job.Cycle == 0 {
		return "shorter cycles stagnated"
	}
	return r.why["basis"]
}

// arrange puts choices into the order in which a reader wants them.
func arrange(list []report.Choice) {
	order := []string{"method", "precondition", "order", "scaling", "blocks", "cycle", "basis", "sketch", "window", "memory", "threads"}
	slices.SortStableFunc(list, func(a, b report.Choice) int {
		return slices.Index(order, a.Name) - slices.Index(order, b.Name)
	})
}

// factored names what became of the preconditioner and remembers why.
func (r *runner) factored() string {
	var kinds []string
	for k, f := range r.placed.Factors() {
		if len(kinds) == 0 || kinds[len(kinds)-1] != f.Kind {
			kinds = append(kinds, f.Kind)
		}
		if f.Reason != "" {
			why := fmt.Sprintf("block %d: %s", k+1, f.Reason)
			r.event("preconditioner: " + why)
			if r.why["precondition"] != "" {
				why = r.why["precondition"] + "; " + why
			}
			if k == 0 {
				r.why["precondition"] = why
			}
		}
	}
	return strings.Join(kinds, ", ")
}
