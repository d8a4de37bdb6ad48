package main

import (
	"context"
	"errors"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"

	"rowstead/cmd/internal/memory"
	"rowstead/coordinator/report"
	"rowstead/partition/audit"
	"rowstead/partition/matfile"
)

func (a *app) auditCommand() *cobra.Command {
	var tolerance float64
	var indexBase int
	var memoryBytes int64
	c := &cobra.Command{
		Use:   "audit A.mtx b.mtx x.mtx",
		Short: "check an answer from its files alone",
		Long: "Recomputes b − A·x from the three files in twice the usual precision, streaming, by a path that shares nothing " +
			"with the solver but the reading of files. It does not matter what made the answer.",
		Example: "  rowstead audit dam.mtx load.mtx heads.mtx --tolerance 1e-6\n",
		Args:    exactly("a matrix", "a right side", "an answer"),
		RunE: func(c *cobra.Command, args []string) error {
			if !(tolerance > 0 && tolerance < 1) {
				return usage("--tolerance %v: expected a number between 0 and 1", tolerance)
			}
			read, err := base(indexBase, c.Flags().Changed("index-base"))
			if err != nil {
				return err
			}
			return a.audit(audit.Files{Matrix: args[0], Right: args[1], Answer: args[2]},
				audit.Options{Tolerance: tolerance, Memory: memoryBytes, Read: matfile.Options{IndexBase: read}})
		},
	}
	f := c.Flags()
	f.SortFlags = false
	f.Float64Var(&tolerance, "tolerance", defaultTolerance, "both residuals must be at or below this `NUMBER` (1e-8)")
	f.Var(bytesValue{&memoryBytes}, "memory", "hold entries of this `SIZE` at a time, such as 1GB (256 MiB)")
	f.IntVar(&indexBase, "index-base", -1, "plain triplets count from `0|1`")
	a.jsonAndQuiet(c)
	return c
}

// base reads --index-base.
func base(value int, given bool) (matfile.IndexBase, error) {
	switch {
	case !given:
		return matfile.UnknownBase, nil
	case value == 0:
		return matfile.ZeroBased, nil
	case value == 1:
		return matfile.OneBased, nil
	}
	return matfile.UnknownBase, usage("--index-base %d: expected 0 or 1", value)
}

func baseText(b matfile.IndexBase) string {
	if b == matfile.OneBased {
		return "1"
	}
	return "0"
}

// audit checks the files and prints the result.
func (a *app) audit(files audit.Files, o audit.Options) error {
	rec := report.New("audit")
	rec.Tolerance, rec.Program, rec.Started = report.Number(o.Tolerance), program(), time.Now()
	a.hold("audit", rec)
	for _, in := range []report.Input{{Role: "matrix", Path: files.Matrix}, {Role: "right side", Path: files.Right}, {Role: "answer", Path: files.Answer}} {
		if !exists(in.Path) {
			return usage("%s: there is no such file", in.Path)
		}
		absolute, err := filepath.Abs(in.Path)
		if err != nil {
			return err
		}
		in.Path = absolute
		rec.Inputs = append(rec.Inputs, in)
	}
	result, err := audit.Check(context.Background(), files, o)
	if errors.Is(err, context.Canceled) {
		return err
	}
	if err != nil {
		return &failure{statusInput, err}
	}
	fillAudit(rec, result)
	if o.Read.IndexBase != matfile.UnknownBase {
		rec.Choices = append(rec.Choices, report.Choice{Name: "index-base", Value: baseText(o.Read.IndexBase), Reason: "for plain triplets alone; other formats say themselves from where they count", Asked: true})
	}
	rec.Answer = files.Answer
	rec.Seconds.Check = report.Number(time.Since(rec.Started).Seconds())
	rec.Seconds.Total, rec.CoordinatorPeakBytes = rec.Seconds.Check, memory.Peak()
	a.tell(rec)
	if rec.Verdict != report.Met {
		return &verdictError{statusShort}
	}
	return nil
}

// fillAudit puts the result of an audit into the form of a record.
func fillAudit(rec *report.Record, result *audit.Result) {
	rec.Rows, rec.Columns, rec.Entries = result.Rows, result.Unknowns, int(result.Entries)
	rec.Complex = result.Complex
	for i, c := range result.Columns {
		side := report.Side{Column: i, Verdict: report.Met, Residuals: report.Unmeasured()}
		if !c.Met {
			side.Verdict, side.Reason = report.Short, "the residual is above the tolerance"
		}
		r := &side.Residuals
		r.True, r.Scaled = report.Number(c.True), report.Number(c.Scaled)
		r.RowWise, r.Backward = report.Number(c.RowWise), report.Number(c.Backward)
		for _, w := range c.Worst {
			r.Worst = append(r.Worst, report.Row{Row: w.Row, Error: report.Number(w.Error)})
		}
		rec.Sides = append(rec.Sides, side)
	}
	rec.Settle()
}
