// Package samples makes model jobs of an invented engineering office, by name
// and size: systems of the kind and difficulty that such an office meets, each
// with the notes its analyst would leave beside the files.
//
// The nouns are the Model, which can give any row of A and b on demand and so
// needs no memory for the matrix, and the Job, a Model written out. Entry k of x
// is unknown k mod BlockSize of node k / BlockSize; indices are zero-based. The
// same name and size give the same bits on every machine. The package does no
// I/O and starts no goroutine; a Model may be shared between goroutines.
//
// The office, its people and its places do not exist.
package samples

import (
	"fmt"
	"strings"

	"rowstead/partition/csr"
)

// Smallest and Largest are the limits of the number of unknowns asked for.
const (
	Smallest = 300
	Largest  = 50_000_000
)

// Unknown is one kind of unknown of a job.
type Unknown struct {
	Symbol, Unit string
	// Low and High bound what a plausible answer holds at any size; both were
	// set from solved jobs, with room.
	Low, High float64
}

// Info describes a job before any size is chosen.
type Info struct {
	Name        string // the word for the command line
	Title       string // one line
	DefaultSize int    // unknowns, when none is asked for
	Symmetric   bool   // A = Aᵀ to the last bit
	Definite    bool   // symmetric positive definite
	MMatrix     bool   // off-diagonal entries ≤ 0, diagonal > 0, weakly dominant
	Unknowns    []Unknown
}

// BlockSize is the number of unknowns interleaved at a node.
func (i Info) BlockSize() int { return len(i.Unknowns) }

// generator is one job at one size.
type generator interface {
	// unknowns is the number of rows.
	unknowns() int
	// row writes row k of A, columns ascending, and b[k] into l, which is empty.
	row(k int, l *line)
	// label says in a few words what entry k of x is.
	label(k int) string
	// story tells what the notes need.
	story() story
}

// job is one entry of the list of jobs.
type job struct {
	info  Info
	build func(size int) generator
}

// jobs lists every job in the order in which Names gives them.
func jobs() []job {
	return []job{aquiferJob(), plumeJob(), castingJob(), frameJob(), pipesJob(), waveJob()}
}

// Names lists the jobs.
func Names() []string {
	var names []string
	for _, j := range jobs() {
		names = append(names, j.info.Name)
	}
	return names
}

// Describe returns what is known of the job of that name before a size is
// chosen. The error of an unknown name lists the known ones.
func Describe(name string) (Info, error) {
	j, err := find(name)
	return j.info, err
}

func find(name string) (job, error) {
	for _, j := range jobs() {
		if j.info.Name == name {
			return j, nil
		}
	}
	return job{}, fmt.Errorf("no model job is called %q; there are %s", name, strings.Join(Names(), ", "))
}

// Job is a model job written out.
type Job struct {
	Info
	Matrix *csr.Matrix
	Right  []float64 // b, length Matrix.Rows
	Notes  string    // plain text, lines of at most 80 characters
}

// New makes the job of that name with about size unknowns; 0 takes the job's
// default. The slices are the caller's. O(entries).
func New(name string, size int) (*Job, error) {
	m, err := Open(name, size)
	if err != nil {
		return nil, err
	}
	j := &Job{Info: m.Info, Right: make([]float64, m.Rows()), Notes: m.Notes()}
	a := &csr.Matrix{Rows: m.Rows(), Cols: m.Rows(), Start: make([]int, 1, m.Rows()+1)}
	var l line
	for k := range m.Rows() {
		l.reset()
		m.gen.row(k, &l)
		a.Col, a.Val = append(a.Col, l.cols...), append(a.Val, l.vals...)
		a.Start = append(a.Start, len(a.Col))
		j.Right[k] = l.right
	}
	j.Matrix = a
	return j, nil
}
