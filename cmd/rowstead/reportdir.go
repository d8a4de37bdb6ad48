package main

import (
	"io"
	"os"
	"path/filepath"

	"rowstead/cmd/internal/replace"
	"rowstead/coordinator/report"
)

// reportNames are the files of a report's folder.
var reportNames = [...]string{"report.txt", "report.json", "report.html", "convergence.svg"}

// checkReport makes the folder and refuses files that are there already.
func checkReport(folder string, overwrite bool) error {
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return usage("--report: %w", replace.Plain(err))
	}
	for _, name := range reportNames {
		path := filepath.Join(folder, name)
		if exists(path) && !overwrite {
			return usage("%s: it exists already; --overwrite replaces it", path)
		}
	}
	if err := replace.Probe(filepath.Join(folder, reportNames[0])); err != nil {
		return usage("--report: %w", replace.Plain(err))
	}
	return nil
}

// writeReport writes summary, object, page and picture.
func (a *app) writeReport(folder string, rec *report.Record, overwrite bool) error {
	for i, text := range []string{rec.Text(), string(rec.JSON()), rec.HTML(), rec.Picture()} {
		err := a.pending.Write(filepath.Join(folder, reportNames[i]), overwrite, func(w io.Writer) error {
			_, err := io.WriteString(w, text)
			return err
		})
		if err != nil {
			return err
		}
	}
	return nil
}
