package coordinator

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"

	"rowstead/coordinator/report"
	"rowstead/partition/matfile"
)

// ShortName is where the best answer of a run goes that fell short: "x.mtx"
// becomes "x.short.mtx", "x.mtx.gz" becomes "x.short.mtx.gz".
func ShortName(path string) string {
	folder, name := filepath.Split(path)
	ending := filepath.Ext(name)
	if packed := strings.ToLower(ending); packed == ".gz" || packed == ".zst" {
		ending = filepath.Ext(strings.TrimSuffix(name, ending)) + ending
	}
	return folder + strings.TrimSuffix(name, ending) + ".short" + ending
}

// mostNames is how many short answers may lie beside each other.
const mostNames = 10000

// shortPlace is where a short answer goes and whether it replaces what is there:
// the run's own earlier one, else the first of x.short.mtx, x.short-2.mtx, ...
// that does not exist, unless existing files are to be replaced.
func (r *runner) shortPlace() (path string, overwrite bool) {
	first := ShortName(r.job.Out)
	if r.job.Overwrite {
		return first, true
	}
	free, own := "", r.job.ownShort()
	for n := 1; n < mostNames; n++ {
		path := numbered(first, n)
		if own != "" && filepath.Clean(path) == filepath.Clean(own) {
			return path, true
		}
		if _, err := os.Lstat(path); err != nil {
			if free == "" {
				free = path
			}
			if own == "" || n > 100 {
				break
			}
		}
	}
	if free == "" {
		return first, false
	}
	if free != first {
		r.rec.AnswerNote = fmt.Sprintf("%s was there already and stays as it was", first)
	}
	return free, false
}

// ownShort is the path of the run's own earlier short answer, empty without one.
func (j Job) ownShort() string {
	switch {
	case !j.OwnShort:
		return ""
	case j.ShortPath == "":
		return ShortName(j.Out)
	}
	return j.ShortPath
}

// numbered puts "-n" behind ".short" in a name, from 2.
func numbered(short string, n int) string {
	if n < 2 {
		return short
	}
	at := strings.LastIndex(short, ".short") + len(".short")
	return fmt.Sprintf("%s-%d%s", short[:at], n, short[at:])
}

// finish writes the answer and keeps a snapshot of one that can be carried on.
func (r *runner) finish() error {
	r.rim.Phase(report.Checking)
	r.rec.Complex = r.sys.complex
	r.correct()
	r.knownError()
	if r.rec.Verdict != report.Met {
		if err := r.rim.Snapshot(r.done(), r.x); err != nil {
			r.event(fmt.Sprintf("the snapshot could not be kept: %v", err))
		}
	}
	return r.timed(&r.rec.Seconds.Write, r.write)
}

// done counts the right sides that are finished.
func (r *runner) done() int {
	for c, s := range r.rec.Sides {
		if s.Verdict != report.Met {
			return c
		}
	}
	return len(r.rec.Sides)
}

// write writes the answer. If that fails the answer is kept as a snapshot and
// the error says so.
func (r *runner) write() error {
	path, overwrite := r.job.Out, r.job.Overwrite
	if r.rec.Verdict != report.Met {
		path, overwrite = r.shortPlace()
	}
	d := &matfile.Dense{Rows: len(r.x[0]), Cols: len(r.x), Complex: r.sys.complex, Values: make([]float64, 0, len(r.x)*len(r.x[0]))}
	for _, x := range r.x {
		d.Values = append(d.Values, x...)
	}
	comment := []string{fmt.Sprintf("rowstead %s: residual %s, rows scaled %s, tolerance %s",
		r.rec.Verdict, r.rec.Residuals.True.Short(3), r.rec.Residuals.Scaled.Short(3), r.rec.Tolerance.Short(3))}
	err := matfile.WriteDense(path, d, matfile.WriteOptions{Overwrite: overwrite, Comment: comment})
	if err != nil {
		r.rec.Verdict = report.None
		if inner := (*os.PathError)(nil); errors.As(err, &inner) {
			err = fmt.Errorf("%s: it could not be written: %w", path, inner.Err)
		}
		if kept := r.rim.Snapshot(r.done(), r.x); kept == nil && r.rec.ID != "" {
			return fmt.Errorf("%w; the answer is kept: rowstead resume %s --out PATH writes it elsewhere", err, r.rec.ID)
		}
		return err
	}
	r.rec.Answer = path
	r.rec.AnswerHash, err = matfile.Hash(path)
	return err
}

// knownError compares a trial's answer with the one it was made from.
func (r *runner) knownError() {
	if !r.job.Trial {
		return
	}
	difference, size := 0.0, 0.0
	for i, v := range r.x[0] {
		known := 1.0
		if r.sys.complex && i%2 == 1 {
			known = 0
		}
		difference, size = math.Hypot(difference, v-known), size+known
	}
	r.rec.KnownError = report.Number(difference / math.Sqrt(size))
}

// emptyAgainst lists the rows of the file that have no nonzero entry and a
// right side that is not zero.
func (s *system) emptyAgainst(b []float64) []int {
	var rows []int
	for _, i := range s.empty {
		if b[i] != 0 {
			if s.complex {
				i /= 2
			}
			rows = append(rows, i)
		}
	}
	return rows
}

// findTrouble remembers the rows without a nonzero entry, and whether all columns
// sum to zero.
func (s *system) findTrouble() {
	for i := range s.matrix.Rows {
		_, vals := s.matrix.Row(i)
		if !nonzero(vals) {
			s.empty = append(s.empty, i)
		}
	}
	s.balanced = columnsBalance(s.matrix)
	s.free = s.balanced && columnsBalance(s.matrix.Transpose())
}
