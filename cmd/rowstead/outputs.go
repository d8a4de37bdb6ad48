package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"rowstead/cmd/internal/replace"
	"rowstead/coordinator"
)

// checkOutputs refuses outputs that are inputs, exist or cannot be written,
// before any work.
func (s *session) checkOutputs() error {
	j := s.flags.job
	for _, check := range []func() error{s.notAnInput, s.knownEnding, s.regular, s.free} {
		if err := check(); err != nil {
			return err
		}
	}
	if err := replace.Probe(j.Out); err != nil {
		return usage("the answer cannot be written there: %w; --out FILE writes elsewhere", replace.Plain(err))
	}
	if s.flags.report == "" {
		return nil
	}
	return checkReport(s.flags.report, j.Overwrite)
}

// notAnInput refuses an output that is the file of an input, whatever its name
// and whatever links lead there, with --overwrite too.
func (s *session) notAnInput() error {
	j := s.flags.job
	outputs := []struct{ path, what string }{{j.Out, "--out"}, {coordinator.ShortName(j.Out), "the short answer of --out"}}
	if s.flags.report != "" {
		for _, name := range reportNames {
			outputs = append(outputs, struct{ path, what string }{filepath.Join(s.flags.report, name), "a file of --report"})
		}
	}
	for _, in := range []string{j.Matrix, j.Right, j.Guess, j.Cuts} {
		if in == "" {
			continue
		}
		for _, out := range outputs {
			if sameFile(out.path, in) {
				return usage("%s: %s is an input of this run; give it another name", out.path, out.what)
			}
		}
	}
	return nil
}

// sameFile says that both names lead to one existing file, or are one name.
func sameFile(a, b string) bool {
	first, err := os.Stat(a)
	if err != nil {
		return filepath.Clean(a) == filepath.Clean(b)
	}
	second, err := os.Stat(b)
	return err == nil && os.SameFile(first, second)
}

// knownEnding refuses a name whose ending promises a format that is not
// written.
func (s *session) knownEnding() error {
	name := strings.ToLower(filepath.Base(s.flags.job.Out))
	for _, packed := range []string{".gz", ".zst"} {
		name = strings.TrimSuffix(name, packed)
	}
	if ending := filepath.Ext(name); ending != ".mtx" && ending != ".npy" {
		return usage("--out %s: the answer is written as .mtx or .npy, either of them also with .gz or .zst behind; give such a name", s.flags.job.Out)
	}
	return nil
}

// regular refuses a folder, a device or a pipe.
func (s *session) regular() error {
	path := s.flags.job.Out
	status, err := os.Stat(path)
	switch {
	case err != nil:
		return nil
	case status.IsDir():
		return usage("%s: it is a folder; --out takes the name of a file", path)
	case !status.Mode().IsRegular():
		return usage("%s: it is no ordinary file; --out takes the name of a file", path)
	}
	return nil
}

// free refuses an answer that exists, but tells faults of the inputs first. A
// short answer of an earlier run is no obstacle: the new one takes another name.
func (s *session) free() error {
	j := s.flags.job
	if j.Overwrite || !exists(j.Out) {
		return nil
	}
	if err := coordinator.Inspect(j); err != nil {
		return err
	}
	return usage("%s: it exists already; --overwrite replaces it, --out FILE writes elsewhere", j.Out)
}

// dropShort removes the run's own earlier short answer once the run has met its
// tolerance, and says so in the record.
func (s *session) dropShort() {
	path := s.flags.job.ShortPath
	if path == "" || sameFile(path, s.rec.Answer) || !ownShort(path, s.old) {
		return
	}
	if err := os.Remove(path); err != nil {
		s.rec.AnswerNote = fmt.Sprintf("the earlier short answer %s could not be removed", path)
		return
	}
	s.rec.AnswerNote = fmt.Sprintf("the earlier short answer %s was removed", path)
}
