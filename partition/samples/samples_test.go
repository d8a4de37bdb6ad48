package samples

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"errors"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"rowstead/partition/csr"
)

// sizes are those at which every job is looked at closely.
func sizes() []int { return []int{300, 500} }

func made(t *testing.T, name string, size int) *Job {
	t.Helper()
	j, err := New(name, size)
	if err != nil {
		t.Fatalf("New(%q, %d): %v", name, size, err)
	}
	return j
}

// reference solves the job with a dense factorisation.
func reference(t *testing.T, j *Job) []float64 {
	t.Helper()
	n := j.Matrix.Rows
	full := mat.NewDense(n, n, nil)
	for i := range n {
		cols, vals := j.Matrix.Row(i)
		for k, c := range cols {
			full.Set(i, int(c), vals[k])
		}
	}
	x := mat.NewVecDense(n, nil)
	if err := x.SolveVec(full, mat.NewVecDense(n, append([]float64(nil), j.Right...))); err != nil {
		if _, ill := err.(mat.Condition); !ill {
			t.Fatalf("%s: %v", j.Name, err)
		}
	}
	return x.RawVector().Data
}

func TestJobsKeepTheirWord(t *testing.T) {
	for _, name := range Names() {
		for _, size := range sizes() {
			j := made(t, name, size)
			if err := j.Matrix.Check(); err != nil {
				t.Errorf("%s of %d: %v", name, size, err)
			}
			if off := math.Abs(float64(j.Matrix.Rows-size)) / float64(size); off > 0.2 {
				t.Errorf("%s of %d has %d unknowns", name, size, j.Matrix.Rows)
			}
			if j.Matrix.Rows%j.BlockSize() != 0 {
				t.Errorf("%s: %d unknowns in nodes of %d", name, j.Matrix.Rows, j.BlockSize())
			}
			if got := symmetric(j.Matrix); got != j.Symmetric {
				t.Errorf("%s of %d: symmetric %v, want %v", name, size, got, j.Symmetric)
			}
			if j.MMatrix {
				checkMMatrix(t, j)
			}
			checkAnswer(t, j, reference(t, j))
		}
	}
}

func symmetric(a *csr.Matrix) bool {
	b := a.Transpose()
	for k := range a.Val {
		if a.Col[k] != b.Col[k] || a.Val[k] != b.Val[k] {
			return false
		}
	}
	return true
}

// checkMMatrix wants no positive entry off the diagonal and rows that sum to
// zero or more, up to the rounding of their own terms.
func checkMMatrix(t *testing.T, j *Job) {
	t.Helper()
	for i := range j.Matrix.Rows {
		cols, vals := j.Matrix.Row(i)
		sum, size := 0.0, 0.0
		for k, c := range cols {
			if (int(c) == i) != (vals[k] > 0) {
				t.Fatalf("%s: entry (%d, %d) is %v", j.Name, i, c, vals[k])
			}
			sum, size = sum+vals[k], size+math.Abs(vals[k])
		}
		if sum < -1e-13*size {
			t.Fatalf("%s: row %d sums to %v of %v", j.Name, i, sum, size)
		}
	}
}

// checkAnswer wants every unknown within the range that the notes promise.
func checkAnswer(t *testing.T, j *Job, x []float64) {
	t.Helper()
	for kind, u := range j.Unknowns {
		low, high := math.Inf(1), math.Inf(-1)
		for k := kind; k < len(x); k += j.BlockSize() {
			low, high = min(low, x[k]), max(high, x[k])
		}
		if !(low >= u.Low && high <= u.High) {
			t.Errorf("%s of %d: %s lies in [%v, %v], the notes say [%v, %v]", j.Name, len(x), u.Symbol, low, high, u.Low, u.High)
		}
		t.Logf("%s of %d: %s in [%.4g, %.4g] %s", j.Name, len(x), u.Symbol, low, high, u.Unit)
	}
}

// A definite job has a Cholesky factor.
func TestDefiniteJobsAre(t *testing.T) {
	for _, name := range Names() {
		j := made(t, name, 300)
		if !j.Definite {
			continue
		}
		full := mat.NewSymDense(j.Matrix.Rows, nil)
		for i := range j.Matrix.Rows {
			cols, vals := j.Matrix.Row(i)
			for k, c := range cols {
				full.SetSym(i, int(c), vals[k])
			}
		}
		var factor mat.Cholesky
		if !factor.Factorize(full) {
			t.Errorf("%s: no Cholesky factor", name)
		}
	}
}

// The same bits on every processor, matrix and right side: digests taken once.
func TestBitsAreFixed(t *testing.T) {
	want := map[string]string{
		"aquifer": "8a38aa602ce7a166",
		"plume":   "61e67eb33b036d20",
		"casting": "8dfb35e3e781c321",
		"frame":   "a867e195f9bd76b4",
		"pipes":   "c8a5333e4fdccc50",
		"wave":    "7a4b8b0c605b2ddc",
	}
	for _, name := range Names() {
		j, hash := made(t, name, 2000), sha256.New()
		put := func(v uint64) {
			var word [8]byte
			binary.LittleEndian.PutUint64(word[:], v)
			hash.Write(word[:])
		}
		for i := range j.Matrix.Rows {
			cols, vals := j.Matrix.Row(i)
			for k, c := range cols {
				put(uint64(c))
				put(math.Float64bits(vals[k]))
			}
			put(math.Float64bits(j.Right[i]))
		}
		if got := hex.EncodeToString(hash.Sum(nil)[:8]); got != want[name] {
			t.Errorf("%s: digest %s, want %s", name, got, want[name])
		}
	}
}

// A Model gives row by row what New writes out.
func TestModelStreamsTheSameRows(t *testing.T) {
	for _, name := range Names() {
		j := made(t, name, 900)
		m, err := Open(name, 900)
		if err != nil {
			t.Fatal(err)
		}
		seen, right := 0, m.Right()
		err = m.EachRow(func(row int, cols []int32, vals []float64) error {
			wantCols, wantVals := j.Matrix.Row(row)
			if row != seen || len(cols) != len(wantCols) {
				t.Fatalf("%s: row %d of %d entries came as number %d", name, row, len(cols), seen)
			}
			for k := range cols {
				if cols[k] != wantCols[k] || vals[k] != wantVals[k] {
					t.Fatalf("%s: row %d differs", name, row)
				}
			}
			if right[row] != j.Right[row] {
				t.Fatalf("%s: right side of row %d differs", name, row)
			}
			seen++
			return nil
		})
		if err != nil || seen != m.Rows() || m.Entries() != j.Matrix.Entries() {
			t.Errorf("%s: %d of %d rows, %d of %d entries, error %v", name, seen, m.Rows(), m.Entries(), j.Matrix.Entries(), err)
		}
	}
}

func TestNotesAndLabels(t *testing.T) {
	for _, name := range Names() {
		m, err := Open(name, 0)
		if err != nil {
			t.Fatal(err)
		}
		notes := m.Notes()
		prose := strings.Join(strings.Fields(notes), " ")
		for _, part := range []string{office, caution, "Question", "Equations", "Entry k of x", "plausible answer"} {
			if !strings.Contains(prose, part) {
				t.Errorf("%s: the notes lack %q:\n%s", name, part, notes)
			}
		}
		for _, text := range strings.Split(notes, "\n") {
			if len([]rune(text)) > 80 {
				t.Errorf("%s: a line of %d characters: %s", name, len([]rune(text)), text)
			}
		}
		if a, b := m.Label(0), m.Label(m.Rows()-1); a == "" || a == b {
			t.Errorf("%s: labels %q and %q", name, a, b)
		}
	}
}

func TestRefusals(t *testing.T) {
	for _, c := range []struct {
		name, job string
		size      int
		want      string
	}{
		{"unknown job", "bridge", 0, "aquifer"},
		{"too small", "aquifer", 12, "between 300 and"},
		{"negative", "aquifer", -1, "between 300 and"},
		{"absurd", "aquifer", 1 << 40, "between 300 and"},
	} {
		if _, err := New(c.job, c.size); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: New(%q, %d) gave error %v, want one with %q", c.name, c.job, c.size, err, c.want)
		}
	}
	if _, err := Describe("bridge"); err == nil {
		t.Errorf("Describe of an unknown job gave no error")
	}
}

// The k-th refusal of the receiver ends the walk with its own error.
func TestWalkEndsWithTheReceiversError(t *testing.T) {
	m, err := Open("pipes", 300)
	if err != nil {
		t.Fatal(err)
	}
	full := errors.New("disk full")
	for _, last := range []int{0, 1, 299} {
		got := m.EachRow(func(row int, _ []int32, _ []float64) error {
			if row == last {
				return full
			}
			if row > last {
				t.Fatalf("row %d after the error in row %d", row, last)
			}
			return nil
		})
		if got != full {
			t.Errorf("error in row %d came back as %v", last, got)
		}
	}
}
