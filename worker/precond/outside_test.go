//go:build outside

package precond

import (
	"bytes"
	"cmp"
	"fmt"
	"math"
	"os"
	"os/exec"
	"testing"

	"rowstead/partition/csr"
)

// spilu prints the factors of SciPy's sparse incomplete LU (SuperLU) of the
// triplets on its standard input, with neither dropping, reordering nor
// pivoting: one line "i j v" for each entry of L and then of U.
const spilu = `
import sys, numpy, scipy.sparse, scipy.sparse.linalg as l
n = int(sys.stdin.readline())
t = numpy.loadtxt(sys.stdin)
a = scipy.sparse.csc_matrix((t[:, 2], (t[:, 0].astype(int), t[:, 1].astype(int))), shape=(n, n))
f = l.spilu(a, drop_tol=0, fill_factor=n, permc_spec='NATURAL', diag_pivot_thresh=0, options=dict(SymmetricMode=True))
assert (f.perm_r == numpy.arange(n)).all() and (f.perm_c == numpy.arange(n)).all()
for m in (scipy.sparse.tril(f.L, -1), scipy.sparse.triu(f.U)):
    m = m.tocoo()
    for i, j, v in zip(m.row, m.col, m.data):
        print(i, j, repr(float(v)))
`

// SciPy's dropping rules differ, so the factors agree where nothing is dropped.
// PYTHON names an interpreter that has SciPy.
func TestILUTEqualsSciPyWithoutDropping(t *testing.T) {
	for name, a := range map[string]*csr.Matrix{
		"convection and diffusion": plane5(20, 100, 50),
		"irregular":                sparse(300, 4, 1.2, 11),
	} {
		t.Run(name, func(t *testing.T) {
			want := spiluFactors(t, a)
			f := ilut(a, Options{Fill: a.Rows})
			got := map[[2]int]float64{}
			for i := range a.Rows {
				got[[2]int{i, i}] = 1 / f.inverse[i]
				cols, vals := f.lower.Row(i)
				for k, c := range cols {
					got[[2]int{i, int(c)}] = vals[k]
				}
				cols, vals = f.upper.Row(i)
				for k, c := range cols {
					got[[2]int{i, int(c)}] = vals[k] / f.inverse[i]
				}
			}
			if len(want) < a.Rows {
				t.Fatalf("SciPy printed %d entries for %d rows", len(want), a.Rows)
			}
			for at, v := range want {
				if math.Abs(got[at]-v) > 1e-12*math.Max(1, math.Abs(v)) {
					t.Fatalf("factor at %v is %v, SciPy has %v", at, got[at], v)
				}
				delete(got, at)
			}
			for at, v := range got {
				if math.Abs(v) > 1e-12 {
					t.Fatalf("factor at %v is %v, SciPy has none", at, v)
				}
			}
		})
	}
}

func spiluFactors(t *testing.T, a *csr.Matrix) map[[2]int]float64 {
	t.Helper()
	var in, out, fault bytes.Buffer
	fmt.Fprintln(&in, a.Rows)
	for i := range a.Rows {
		cols, vals := a.Row(i)
		for k, c := range cols {
			fmt.Fprintln(&in, i, c, vals[k])
		}
	}
	python := cmp.Or(os.Getenv("PYTHON"), "python3")
	cmd := exec.Command(python, "-c", spilu)
	cmd.Stdin, cmd.Stdout, cmd.Stderr = &in, &out, &fault
	if err := cmd.Run(); err != nil {
		t.Fatalf("%s with SciPy: %v\n%s", python, err, fault.String())
	}
	factors := map[[2]int]float64{}
	for {
		var i, j int
		var v float64
		if n, _ := fmt.Fscan(&out, &i, &j, &v); n < 3 {
			return factors
		}
		factors[[2]int{i, j}] = v
	}
}
