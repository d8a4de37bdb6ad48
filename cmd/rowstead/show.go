package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"rowstead/cmd/internal/records"
	"rowstead/coordinator/report"
)

func (a *app) showCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "show RUN",
		Short: "print one past run",
		Long:  "Prints the summary of a run, its inputs with their SHA-256, and what happened on the way. RUN is its name in \"rowstead runs\", or the beginning of it.",
		Args:  exactly("the name of a run"),
		RunE: func(_ *cobra.Command, args []string) error {
			store, err := records.Open(&a.pending)
			if err != nil {
				return err
			}
			run, err := store.Find(args[0])
			if err != nil {
				return usage("%w", err)
			}
			rec, err := run.Load()
			if err != nil {
				return usage("%w", err)
			}
			if a.json {
				a.sayObject(rec.JSON())
				return nil
			}
			a.showStory(rec)
			return nil
		},
	}
	a.jsonFlag(c)
	return c
}

// showStory prints the record for a person.
func (a *app) showStory(r *report.Record) {
	fmt.Fprintf(a.stdout, "Run %s, %s, begun %s with rowstead %s\n\n", r.ID, r.State, r.Started.Format("2006-01-02 15:04:05"), r.Program.Version)
	fmt.Fprint(a.stdout, r.Text())
	fmt.Fprintln(a.stdout, "\nInputs")
	for _, in := range r.Inputs {
		fmt.Fprintf(a.stdout, "  %-11s %s\n  %-11s %d bytes, SHA-256 %s\n", in.Role, in.Path, "", in.Size, in.Hash)
	}
	if len(r.Story) > 0 {
		fmt.Fprintln(a.stdout, "\nWhat happened")
	}
	for _, e := range r.Story {
		fmt.Fprintf(a.stdout, "  %6d products, cycle %d, step %d: %s\n", e.Products, e.Cycle, e.Step, e.Text)
	}
}
