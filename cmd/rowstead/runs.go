package main

import (
	"encoding/json"
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"

	"rowstead/cmd/internal/records"
	"rowstead/coordinator/report"
)

func (a *app) runsCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "runs",
		Short: "list past runs",
		Long:  "Lists the runs of this user, oldest first: name, state, verdict, residual, matrix. The folder is " + records.HomeVariable + " or rowstead in the user's state folder.",
		Args:  exactly(),
		RunE: func(*cobra.Command, []string) error {
			store, err := records.Open(&a.pending)
			if err != nil {
				return err
			}
			all, err := store.List()
			if err != nil {
				return err
			}
			if a.json {
				return a.runsObject(all)
			}
			if len(all) == 0 {
				fmt.Fprintln(a.stdout, "There are no runs yet.")
			}
			for _, r := range all {
				fmt.Fprintln(a.stdout, runLine(r))
			}
			return nil
		},
	}
	a.jsonFlag(c)
	return c
}

// runLine is one run in one line.
func runLine(r *report.Record) string {
	if r.State == "" {
		return fmt.Sprintf("%-34s no readable record", r.ID)
	}
	residual := "-"
	if r.Residuals.True.Finite() {
		residual = fmt.Sprintf("%.1e", float64(r.Residuals.True))
	}
	line := fmt.Sprintf("%-34s %-11s %-6s %-8s %9d rows  %s", r.ID, r.State, r.Verdict, residual, r.Rows, matrixOf(r))
	if r.State == report.BrokenOff && r.Advice != "" {
		line += "; " + r.Advice
	}
	return line
}

// matrixOf is the name of the matrix file.
func matrixOf(r *report.Record) string {
	for _, in := range r.Inputs {
		if in.Role == "matrix" {
			return filepath.Base(in.Path)
		}
	}
	return ""
}

// runsObject prints the list as one object.
func (a *app) runsObject(all []*report.Record) error {
	type line struct {
		ID       string        `json:"id"`
		State    string        `json:"state"`
		Verdict  string        `json:"verdict"`
		Residual report.Number `json:"true_residual"`
		Rows     int           `json:"rows"`
		Matrix   string        `json:"matrix"`
		Record   string        `json:"record"`
		Advice   string        `json:"advice"` // how to go on with one that is broken off
	}
	lines := make([]line, len(all))
	for i, r := range all {
		lines[i] = line{r.ID, r.State, r.Verdict, r.Residuals.True, r.Rows, matrixOf(r), r.Path, ""}
		if r.State == report.BrokenOff {
			lines[i].Advice = r.Advice
		}
	}
	text, err := json.Marshal(map[string]any{"runs": lines})
	if err != nil {
		return err
	}
	a.sayObject(append(text, '\n'))
	return nil
}
