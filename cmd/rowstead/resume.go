package main

import (
	"errors"
	"fmt"
	"path/filepath"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"rowstead/cmd/internal/records"
	"rowstead/coordinator/report"
	"rowstead/partition/matfile"
)

func (a *app) resumeCommand() *cobra.Command {
	var changes solveFlags
	c := &cobra.Command{
		Use:   "resume RUN",
		Short: "carry on with a run",
		Long: "Takes up a run that was interrupted, fell short or could not write its answer, with the same files and flags, " +
			"from its last snapshot. A file that has changed since is refused. RUN is its name in \"rowstead runs\", or the beginning of it.",
		Args: exactly("the name of a run"),
	}
	f := c.Flags()
	f.SortFlags = false
	f.StringVar(&changes.job.Out, "out", "", "write the answer to `FILE` instead")
	f.BoolVar(&changes.job.Overwrite, "overwrite", false, "replace existing files")
	f.Var(timeValue{&changes.job.TimeLimit}, "time-limit", "stop after this `TIME`, such as 10m, and keep the answer so far")
	f.StringVar(&changes.report, "report", "", "write report.txt, report.json, report.html and convergence.svg to folder `DIR`")
	a.jsonAndQuiet(c)
	c.RunE = func(_ *cobra.Command, args []string) error {
		s, err := a.takeUp(args[0])
		if err != nil {
			return err
		}
		s.apply(changes)
		return a.solve(s)
	}
	return c
}

// takeUp builds the session of an earlier run.
func (a *app) takeUp(id string) (*session, error) {
	store, err := records.Open(&a.pending)
	if err != nil {
		return nil, err
	}
	run, err := store.Find(id)
	if err != nil {
		return nil, usage("%w", err)
	}
	old, err := run.Load()
	if err != nil {
		return nil, usage("%w", err)
	}
	if run.Alive() {
		return nil, usage("run %s is still going on", run.ID)
	}
	if old.Job != "solve" {
		return nil, usage("run %s is of the kind %q, which cannot be carried on", run.ID, old.Job)
	}
	snapshot, err := run.LoadSnapshot()
	switch {
	case errors.Is(err, records.ErrNoSnapshot) && old.Verdict == report.Met:
		return nil, usage("run %s has met its tolerance; there is nothing to carry on", run.ID)
	case err != nil && !errors.Is(err, records.ErrNoSnapshot):
		return nil, fmt.Errorf("run %s: %w", run.ID, err)
	}
	s := &session{asked: old.Asked, run: run, old: old}
	if err := s.again(old); err != nil {
		return nil, err
	}
	s.flags.job.Start = snapshot.X
	return s, nil
}

// again sets the flags and inputs that the run had.
func (s *session) again(old *report.Record) error {
	f := pflag.NewFlagSet("record", pflag.ContinueOnError)
	s.flags.add(f)
	for name, text := range old.Asked {
		if err := f.Set(name, text); err != nil {
			return usage("the record's --%s %q is not understood: %w", name, text, err)
		}
	}
	j := &s.flags.job
	for _, path := range []*string{&j.Out, &s.flags.report} {
		if *path != "" && !filepath.IsAbs(*path) {
			*path = filepath.Join(old.Folder, *path)
		}
	}
	j.Hashes = map[string]string{}
	for _, in := range old.Inputs {
		j.Hashes[in.Role] = in.Hash
		switch in.Role {
		case "matrix":
			j.Matrix = in.Path
		case "right side":
			j.Right = in.Path
		case "guess":
			j.Guess = in.Path
		case "cuts":
			j.Cuts = in.Path
		}
	}
	if own := old.Answer; own != "" && old.Verdict == report.Short {
		if !filepath.IsAbs(own) {
			own = filepath.Join(old.Folder, own)
		}
		if ownShort(own, old) {
			j.OwnShort, j.ShortPath = true, own
		}
	}
	return s.flags.check(f)
}

// ownShort says that the short answer at path is the one that the run wrote and
// nobody has changed since.
func ownShort(path string, old *report.Record) bool {
	if old.AnswerHash == "" {
		return false
	}
	hash, err := matfile.Hash(path)
	return err == nil && hash == old.AnswerHash
}

// apply changes what was asked for anew.
func (s *session) apply(changes solveFlags) {
	j := &s.flags.job
	if changes.job.Out != "" {
		j.Out = changes.job.Out
		s.asked = withFlag(s.asked, "out", changes.job.Out)
	}
	j.Overwrite = changes.job.Overwrite
	j.TimeLimit = changes.job.TimeLimit
	s.flags.report = changes.report
}

// withFlag is a copy of asked with one more flag.
func withFlag(asked map[string]string, name, text string) map[string]string {
	out := map[string]string{name: text}
	for k, v := range asked {
		if k != name {
			out[k] = v
		}
	}
	return out
}
