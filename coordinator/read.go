package coordinator

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"rowstead/coordinator/report"
	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

// system is A·x = b as read, in the order and units of the file. Complex systems
// are in their real form: unknown k has the rows 2k and 2k+1.
type system struct {
	head    matfile.Header
	matrix  *csr.Matrix
	right   [][]float64 // one a right side
	guess   [][]float64 // one a right side; nil: zero
	complex bool
	real    bool  // the right side came as a real one
	empty   []int // rows without a nonzero entry
	// balanced says that every column sums to zero, free that every row does too.
	balanced, free bool
}

// look reads the matrix's header and refuses what cannot be solved, before any
// memory is promised.
func look(j Job) (matfile.Header, error) {
	in, err := matfile.Open(j.Matrix, j.options())
	if err != nil {
		return matfile.Header{}, reading(j.Matrix, err)
	}
	head := in.Header()
	if err := in.Close(); err != nil {
		return head, err
	}
	switch {
	case head.Rows != head.Cols:
		return head, &InputError{fmt.Sprintf("%s: %s in %s; solve needs a square matrix", j.Matrix, counted(head.Rows/realForm(head), "equation", "equations"), counted(head.Cols/realForm(head), "unknown", "unknowns"))}
	case head.Rows == 0:
		return head, &InputError{j.Matrix + ": the matrix has no rows"}
	case j.Right == "" && !j.Trial && head.Format != harwellBoeing:
		return head, &InputError{"there is no right side: write rowstead solve A.mtx b.mtx, or --trial for b = A·(1, …, 1)"}
	}
	return head, nil
}

// counted writes a count with its noun.
func counted(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %s", n, many)
}

// realForm is how many rows of the real form a row of the file has.
func realForm(head matfile.Header) int {
	if head.Complex {
		return 2
	}
	return 1
}

// Inspect reads the headers of the inputs, without taking memory for them, and
// tells what is wrong with them.
func Inspect(j Job) error {
	if _, err := look(j); err != nil {
		return err
	}
	for _, path := range []string{j.Right, j.Guess, j.Cuts} {
		if path == "" {
			continue
		}
		f, err := os.Open(path)
		if err != nil {
			return reading(path, err)
		}
		status, err := f.Stat()
		f.Close() // read only
		if err == nil && status.IsDir() {
			return &InputError{path + ": it is a folder, not a file"}
		}
	}
	return nil
}

// harwellBoeing is the format whose files may carry their own right sides.
const harwellBoeing = "harwell-boeing"

func (j Job) options() matfile.Options {
	return matfile.Options{IndexBase: j.IndexBase, Threads: j.Threads}
}

// reading makes faults of opening a file faults of the input.
func reading(path string, err error) error {
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return &InputError{path + ": there is no such file"}
	case errors.Is(err, fs.ErrPermission):
		return &InputError{path + ": it may not be read"}
	}
	if status, failed := os.Stat(path); failed == nil && status.IsDir() {
		return &InputError{path + ": it is a folder, not a file"}
	}
	return err
}

// load reads all inputs and checks that they belong together.
func load(ctx context.Context, j Job, head matfile.Header) (*system, error) {
	s := &system{head: head, complex: head.Complex}
	var err error
	if s.matrix, _, err = matfile.ReadMatrix(j.Matrix, j.options()); err != nil {
		return nil, reading(j.Matrix, err)
	}
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	if j.Trial {
		ones := make([]float64, s.matrix.Rows)
		for i := range ones {
			if !s.complex || i%2 == 0 {
				ones[i] = 1
			}
		}
		b := make([]float64, s.matrix.Rows)
		s.matrix.Mul(b, ones)
		s.right = [][]float64{b}
	} else if s.right, s.real, err = s.vectors(j, j.right(), "right side"); err != nil {
		return nil, err
	}
	return s, s.begin(j)
}

// right is the file of the right sides: the matrix's own when none is named.
func (j Job) right() string {
	if j.Right == "" {
		return j.Matrix
	}
	return j.Right
}

// begin finds the vectors to start from.
func (s *system) begin(j Job) error {
	var err error
	switch {
	case j.Start != nil:
		s.guess = j.Start
	case j.Guess != "":
		if s.guess, _, err = s.vectors(j, j.Guess, "guess"); err != nil {
			return err
		}
	default:
		return nil
	}
	if len(s.guess) == 1 && len(s.right) > 1 {
		for len(s.guess) < len(s.right) {
			s.guess = append(s.guess, s.guess[0])
		}
	}
	if len(s.guess) != len(s.right) || len(s.guess[0]) != s.matrix.Rows {
		return &InputError{fmt.Sprintf("the guess has %s of %d, the right side %d of %d", counted(len(s.guess), "column", "columns"), len(s.guess[0]), len(s.right), s.matrix.Rows)}
	}
	return nil
}

// vectors reads columns that must be as long as the matrix has rows; real ones
// of a complex matrix get imaginary parts of zero.
func (s *system) vectors(j Job, path, role string) (columns [][]float64, isReal bool, err error) {
	d, _, err := matfile.ReadDense(path, j.options())
	if err != nil {
		return nil, false, reading(path, err)
	}
	if d.Complex && !s.complex {
		return nil, false, &InputError{fmt.Sprintf("%s: a complex %s of a real matrix; give real and imaginary part as two columns", path, role)}
	}
	isReal = !d.Complex
	if s.complex {
		d = d.Interleaved()
	}
	if d.Rows != s.matrix.Rows {
		unit := 1
		if s.complex {
			unit = 2
		}
		return nil, false, &InputError{fmt.Sprintf("%s: the %s has %s, the matrix %s", path, role, counted(d.Rows/unit, "entry", "entries"), counted(s.matrix.Rows/unit, "row", "rows"))}
	}
	if d.Cols == 0 {
		return nil, false, &InputError{fmt.Sprintf("%s: the %s has no columns", path, role)}
	}
	for c := range d.Cols {
		columns = append(columns, d.Column(c))
	}
	return columns, isReal, nil
}

// inputs hashes every file beside the reading; wait returns them in order.
func inputs(j Job) (wait func() ([]report.Input, error)) {
	var list []report.Input
	for _, in := range []report.Input{{Role: "matrix", Path: j.Matrix}, {Role: "right side", Path: j.Right}, {Role: "guess", Path: j.Guess}, {Role: "cuts", Path: j.Cuts}} {
		if in.Path != "" {
			list = append(list, in)
		}
	}
	done := make(chan error, 1)
	go func() {
		var failed error
		for i := range list {
			failed = errors.Join(failed, fingerprint(&list[i]))
		}
		done <- failed
	}()
	return func() ([]report.Input, error) {
		err := <-done
		return list, err
	}
}

// fingerprint fills in size, hash and the absolute path.
func fingerprint(in *report.Input) error {
	status, err := os.Stat(in.Path)
	if err != nil {
		return reading(in.Path, err)
	}
	in.Size = status.Size()
	if in.Hash, err = matfile.Hash(in.Path); err != nil {
		return reading(in.Path, err)
	}
	in.Path, err = filepath.Abs(in.Path)
	return err
}

// unchanged compares the inputs with the hashes that a resumed run had.
func unchanged(j Job) error {
	if len(j.Hashes) == 0 {
		return nil
	}
	list, err := inputs(j)()
	if err != nil {
		return err
	}
	for _, in := range list {
		if hash, known := j.Hashes[in.Role]; known && hash != in.Hash {
			return &InputError{fmt.Sprintf("%s: the %s has changed since the run began; solve it anew", in.Path, in.Role)}
		}
	}
	return nil
}
