package coordinator

import (
	"fmt"
	"math"
	"os"
	"strings"

	"rowstead/coordinator/method"
	"rowstead/partition/matfile"
)

// shareOfFree is how much of the free memory a run takes when nothing is said.
const shareOfFree = 0.7

// size is what memory depends on, as far as the header tells.
type size struct {
	rows, entries float64
	columns       float64 // right sides
	precondition  string
	method        string
	recycle       float64
	processes     float64 // beside the coordinator's own
}

// part is one thing that takes memory.
type part struct {
	name  string
	bytes float64
}

// form is how long a cycle is and how its basis is kept.
type form struct {
	basis method.BasisForm
	cycle int
}

// Lengths of the cycle. The longest is what the orthogonal method takes on short
// problems; the usual one is the default of long ones; below the shortest,
// restarts cost more than they save (NUMERICS: cycles of 120 stagnate where 300
// converge).
const (
	longestCycle  = 1000
	usualCycle    = 300
	shortestCycle = 120
	leastCycle    = 30
)

// programBytes is what the program itself holds, measured on small systems.
const programBytes = 24e6

// What conjugate gradients hold beside the vectors of every method: measured on
// symmetric systems of 60,000 to 600,000 rows, 8 % above the largest size seen.
const (
	conjugateVectors = 8
	conjugateBytes   = 6e6
)

// parts lists what a run holds at its largest. Reading is over when the basis is
// taken, so that the larger of the two counts.
func (s size) parts(f form) []part {
	vector := 8 * s.rows
	matrix := 12*s.entries + 8*s.rows
	vectors := 6*vector + 3*2*s.rows + 2*vector*s.columns
	list := []part{{"program", programBytes * (1 + s.processes)}, {"matrix", matrix}, {"vectors", vectors}}
	if fill := s.factorEntries(); fill > 0 {
		list = append(list, part{"preconditioner", 12*fill + 24*s.rows})
	}
	if s.method == method.CG {
		return append(list, part{"directions", conjugateVectors*vector + conjugateBytes})
	}
	k := min(float64(f.cycle), s.rows) + 1
	basis := vector * k
	switch f.basis {
	case method.Single:
		basis /= 2
	case method.Replay:
		basis = vector * 8
	}
	// Beside b_j itself the small problem keeps Q, R and the sketches.
	sketch := 4 * (k + 2*s.recycle + 4)
	return append(list, part{"basis", basis}, part{"recycled", 3 * vector * s.recycle}, part{"sketches", 8*sketch*k*2 + 16*k*k})
}

// factorEntries is how many numbers the preconditioner stores.
func (s size) factorEntries() float64 {
	switch s.precondition {
	case "none":
		return 0
	case "diagonal":
		return s.rows
	case "ilut":
		return 41 * s.rows // 20 in L, 20 in U, the diagonal
	}
	return s.entries
}

// total is the larger of what reading and what solving holds.
func (s size) total(f form) float64 {
	sum := 0.0
	for _, p := range s.parts(f) {
		sum += p.bytes
	}
	return max(sum, 28*s.entries+8*s.rows)
}

// FitError says that a run cannot fit, and how much is missing.
type FitError struct {
	Need, Allowed float64 // bytes
	Parts         []part
}

// Error names the bytes that are missing and every part.
func (e *FitError) Error() string {
	var b strings.Builder
	fmt.Fprintf(&b, "this cannot fit: %s are missing (%s needed, %s allowed):", bytesText(e.Need-e.Allowed), bytesText(e.Need), bytesText(e.Allowed))
	for i, p := range e.Parts {
		if i > 0 {
			b.WriteString(",")
		}
		fmt.Fprintf(&b, " %s %s", p.name, bytesText(p.bytes))
	}
	b.WriteString("; raise --memory, or free some, or take a machine with more")
	return b.String()
}

// fit chooses the first candidate that fits. Where none does, but conjugate
// gradients, which keep no basis, could and the file declares a matrix that they
// are made for, they are taken: s.method says so afterwards. why is empty when
// the basis is in double and the cycle at least the usual one; whatever was asked
// for stays.
func (s *size) fit(j Job, allowed float64) (f form, why string, err error) {
	f, why, err = s.fitBasis(j, allowed)
	if err == nil || !automatic(j.Method) || !declaredSymmetric(j) {
		return f, why, err
	}
	without := *s
	without.method = method.CG
	if without.total(f) > allowed {
		return form{}, "", &FitError{Need: without.total(f), Allowed: allowed, Parts: without.parts(f)}
	}
	s.method = method.CG
	return form{method.Single, leastCycle}, "", nil
}

// declaredSymmetric says that the header of the matrix promises a real form that
// is symmetric.
func declaredSymmetric(j Job) bool {
	in, err := matfile.Open(j.Matrix, j.options())
	if err != nil {
		return false // told when the matrix is read
	}
	head := in.Header()
	return in.Close() == nil && (head.Symmetry == "symmetric" && !head.Complex || head.Symmetry == "hermitian")
}

// fitBasis is fit for the method that s names.
func (s size) fitBasis(j Job, allowed float64) (f form, why string, err error) {
	list := candidates(j)
	least := list[0]
	for _, f := range list {
		if s.total(f) < s.total(least) {
			least = f
		}
		if s.total(f) > allowed {
			continue
		}
		if f.cycle < usualCycle && j.Cycle == 0 || f.basis != method.Double && automatic(j.Basis) {
			usual := form{method.Double, max(usualCycle, j.Cycle)}
			why = fmt.Sprintf("%d steps in double take %s, allowed are %s", usual.cycle, bytesText(s.total(usual)), bytesText(allowed))
		}
		return f, why, nil
	}
	return form{}, "", &FitError{Need: s.total(least), Allowed: allowed, Parts: s.parts(least)}
}

// candidates lists the forms in the order of preference: long cycles in double,
// in single, shorter ones, replay (twice the products), and last a very short
// one. What was asked for leaves the rest free.
func candidates(j Job) []form {
	list := []form{
		{method.Double, longestCycle}, {method.Double, usualCycle}, {method.Single, usualCycle},
		{method.Double, 200}, {method.Single, 200}, {method.Double, shortestCycle}, {method.Single, shortestCycle},
		{method.Replay, usualCycle}, {method.Single, leastCycle},
	}
	if j.Cycle > 0 {
		list = []form{{method.Double, j.Cycle}, {method.Single, j.Cycle}, {method.Replay, j.Cycle}}
	}
	if automatic(j.Basis) {
		return list
	}
	kept := list[:0]
	for _, f := range list {
		f.basis = method.BasisForm(j.Basis)
		if len(kept) == 0 || kept[len(kept)-1] != f {
			kept = append(kept, f)
		}
	}
	return kept
}

// automatic says that a choice is left to the program.
func automatic(choice string) bool { return choice == "" || choice == Auto }

// believable is the number of entries that a file of that size can hold: four
// bytes an entry are the least in text, and compression gains at most a
// thousandfold.
func believable(head matfile.Header) (float64, error) {
	status, err := os.Stat(head.Path)
	if err != nil {
		return 0, reading(head.Path, err)
	}
	room := float64(status.Size()) / 2
	if head.Compression != "" || head.Format == "npz" {
		room *= 1000
	}
	entries := min(float64(head.Stored), room)
	switch {
	case head.Symmetry != "" && head.Symmetry != "general":
		entries *= 2
	}
	if head.Complex {
		entries *= 4
	}
	return entries, nil
}

// absurd refuses a header whose rows no file of this size can fill when they
// would not even fit the memory.
func absurd(head matfile.Header, s size, allowed float64) error {
	if 64*s.rows > allowed && s.rows > s.entries {
		return &InputError{fmt.Sprintf("%s: the header promises %d rows, which is too large: the file has room for at most %s", head.Path, head.Rows, counted(int(s.entries), "entry", "entries"))}
	}
	return nil
}

// bytesText writes bytes in units of 1000 with three digits.
func bytesText(b float64) string {
	units := []string{"bytes", "kB", "MB", "GB", "TB", "PB"}
	i := 0
	for b >= 999.5 && i < len(units)-1 {
		b, i = b/1000, i+1
	}
	digits := 0
	if i > 0 && b < 100 {
		digits = int(2 - math.Floor(math.Log10(max(b, 1))))
	}
	return fmt.Sprintf("%.*f %s", digits, b, units[i])
}
