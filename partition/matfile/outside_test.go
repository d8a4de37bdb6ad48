//go:build outside

package matfile

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"rowstead/partition/csr"
)

// python runs a script with SciPy in folder and returns what it prints. The
// interpreter is python3 or what PYTHON names; without SciPy the test fails.
func python(t *testing.T, folder, script string) string {
	t.Helper()
	interpreter := os.Getenv("PYTHON")
	if interpreter == "" {
		interpreter = "python3"
	}
	cmd := exec.Command(interpreter, "-c", "import numpy as np, scipy.sparse as sp, scipy.io as sio, time, struct\n"+script)
	cmd.Dir = folder
	out, err := cmd.CombinedOutput()
	if err != nil {
		t.Fatalf("%s with scipy: %v\n%s", interpreter, err, out)
	}
	return string(out)
}

// foreignMatrix makes one matrix in SciPy; its entries go to want.npy as rows,
// columns and values, in a layout of NumPy that needs no reader of sparse files.
const foreignMatrix = `
rng = np.random.default_rng(5)
A = sp.random(40, 30, 0.2, random_state=7, format='csc')
A.data = rng.standard_normal(A.nnz) * 10.0**rng.integers(-200, 200, A.nnz)
S = sp.random(25, 25, 0.2, random_state=8); S = (S + S.T).tocsc()
C = A + 1j * (2 * A)
H = sp.csc_matrix(np.array([[2, 1-3j], [1+3j, 5]]))
def keep(name, M):
    np.save(name + '.want.npy', np.asarray(M.toarray()))
`

func TestSciPyFilesAreReadByUs(t *testing.T) {
	folder := t.TempDir()
	python(t, folder, foreignMatrix+`
def both(name, M, write):
    write(name, M); keep(name, M)
for fmt in ('csr', 'csc', 'coo'):
    for field, M in (('real', A), ('symmetric', S), ('complex', C)):
        both(fmt + field + '.npz', M.asformat(fmt), lambda n, m: sp.save_npz(n, m))
        both(fmt + field + 'stored.npz', M.asformat(fmt), lambda n, m: sp.save_npz(n, m, compressed=False))
L = A.tocsr(); L.indices = L.indices.astype(np.int64); L.indptr = L.indptr.astype(np.int64)
both('long.npz', L, lambda n, m: sp.save_npz(n, m))
both('bool.npz', A.astype(bool), lambda n, m: sp.save_npz(n, m))
both('int.npz', (A != 0).astype(np.int32) * 7, lambda n, m: sp.save_npz(n, m))
both('float32.npz', (S * 1.1).astype(np.float32), lambda n, m: sp.save_npz(n, m))
for name, M in (('a.mtx', A), ('s.mtx', S), ('c.mtx', C), ('h.mtx', H), ('p.mtx', (A != 0)*1)):
    both(name, M, lambda n, m: sio.mmwrite(n, m, precision=17))
both('d.mtx', sp.csr_matrix(A.toarray()), lambda n, m: sio.mmwrite(n, m.toarray(), precision=17))
both('ds.mtx', sp.csr_matrix(S.toarray()), lambda n, m: sio.mmwrite(n, m.toarray(), precision=17))
both('a.mtx.gz', A, lambda n, m: sio.mmwrite(__import__('gzip').open(n, 'wb'), m, precision=17))
# hb_write leaves no blank before a negative number with a three-digit exponent,
# against its own format.
B = A.copy(); B.data = rng.standard_normal(A.nnz) * 10.0**rng.integers(-80, 80, A.nnz)
both('a.rua', B, lambda n, m: sio.hb_write(n, m))
both('s.rua', S, lambda n, m: sio.hb_write(n, m))
for order in 'CF':
    for dtype in ('<f8', '>f8', '<f4', '<i4', '>i8', '<c16', '<c8', '|b1', '|u1'):
        M = np.array(S.toarray() * 100, dtype=dtype, order=order)
        both('n%s%s.npy' % (order, dtype[1:] + ('b' if dtype[0] == '>' else '')), sp.csr_matrix(M), lambda n, m: np.save(n, M))
`)
	wants, err := filepath.Glob(filepath.Join(folder, "*.want.npy"))
	if err != nil || len(wants) < 40 {
		t.Fatalf("%d files, %v", len(wants), err)
	}
	for _, want := range wants {
		path := strings.TrimSuffix(want, ".want.npy")
		w, _, err := ReadMatrix(want, Options{})
		if err != nil {
			t.Fatal(err)
		}
		got, h, err := ReadMatrix(path, Options{})
		if err != nil {
			t.Error(err)
			continue
		}
		w, got = dropZeros(w), dropZeros(got)
		limit := 0.0
		if strings.HasSuffix(path, ".rua") {
			limit = 1e-15 // hb_write rounds to 17 digits or fewer
		}
		if diff := difference(w, got); diff > limit {
			t.Errorf("%s (%s): largest relative difference %g", filepath.Base(path), h.Format, diff)
		}
	}
	t.Logf("%d files", len(wants))
}

// dropZeros returns m without stored zeros.
func dropZeros(m *csr.Matrix) *csr.Matrix {
	var t csr.Triplets
	for i := range m.Rows {
		cols, vals := m.Row(i)
		for k, c := range cols {
			if vals[k] != 0 {
				t.Add(i, int(c), vals[k])
			}
		}
	}
	return t.Matrix(m.Rows, m.Cols)
}

// difference is the largest relative difference of entries, infinite where the
// patterns differ.
func difference(a, b *csr.Matrix) float64 {
	if a.Rows != b.Rows || a.Cols != b.Cols || cmp.Diff(a.Col, b.Col) != "" || cmp.Diff(a.Start, b.Start) != "" {
		return math.Inf(1)
	}
	worst := 0.0
	for k, v := range a.Val {
		worst = max(worst, math.Abs(v-b.Val[k])/math.Abs(v))
	}
	return worst
}

func TestOurFilesAreReadBySciPy(t *testing.T) {
	folder := t.TempDir()
	rng := rand.New(rand.NewPCG(1, 9))
	var entries csr.Triplets
	for range 300 {
		entries.Add(rng.IntN(40), rng.IntN(50), rng.NormFloat64()*math.Pow(10, float64(rng.IntN(600)-300)))
	}
	m := entries.Matrix(40, 50)
	plain := &Dense{Rows: 40 * 50, Cols: 1, Values: make([]float64, 40*50)}
	for i := range m.Rows {
		cols, vals := m.Row(i)
		for k, c := range cols {
			plain.Values[i*m.Cols+int(c)] = vals[k]
		}
	}
	several, pairs := randomDense(20, 3, false), randomDense(20, 2, true)
	for name, err := range map[string]error{
		"matrix":    WriteMatrix(filepath.Join(folder, "a.mtx"), m, WriteOptions{Comment: []string{"ours"}}),
		"gzip":      WriteMatrix(filepath.Join(folder, "a.mtx.gz"), m, WriteOptions{}),
		"entries":   WriteDense(filepath.Join(folder, "want.npy"), plain, WriteOptions{}),
		"array":     WriteDense(filepath.Join(folder, "d.mtx"), several, WriteOptions{}),
		"array npy": WriteDense(filepath.Join(folder, "d.npy"), several, WriteOptions{}),
		"complex":   WriteDense(filepath.Join(folder, "c.mtx"), pairs, WriteOptions{}),
		"pairs npy": WriteDense(filepath.Join(folder, "c.npy"), pairs, WriteOptions{}),
	} {
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
	}
	got := python(t, folder, `
want = np.load('want.npy').reshape(40, 50)
print((sio.mmread('a.mtx').toarray() == want).all(), (sio.mmread('a.mtx.gz').toarray() == want).all())
d, c = np.load('d.npy'), np.load('c.npy')
print(d.shape, d.flags.f_contiguous, (sio.mmread('d.mtx') == d).all())
print(c.shape, c.dtype, (sio.mmread('c.mtx') == c).all())
print('%r %r' % (float(d[1, 2]), complex(c[3, 1])))
`)
	want := fmt.Sprintf("True True\n(20, 3) True True\n(10, 2) complex128 True\n")
	if !strings.HasPrefix(got, want) {
		t.Errorf("SciPy says\n%swant\n%s", got, want)
	}
	t.Logf("one value of each: %s; ours %v, %v %v", strings.TrimSpace(strings.TrimPrefix(got, want)), several.Values[41], pairs.Values[26], pairs.Values[27])
}

// The ratio of times is logged, never judged: machines are shared.
func TestSpeedAgainstSciPy(t *testing.T) {
	folder := t.TempDir()
	path := filepath.Join(folder, "a.mtx")
	if err := os.WriteFile(path, stencilText(40, 16), 0o644); err != nil {
		t.Fatal(err)
	}
	var theirs float64
	if _, err := fmt.Sscan(python(t, folder, "b=9\nfor k in range(3):\n  s=time.process_time(); sio.mmread('a.mtx').tocsr(); b=min(b,time.process_time()-s)\nprint(b)"), &theirs); err != nil {
		t.Fatal(err)
	}
	ours := math.Inf(1)
	for range 10 {
		start := time.Now()
		if _, _, err := ReadMatrix(path, Options{Threads: 1}); err != nil {
			t.Fatal(err)
		}
		ours = min(ours, time.Since(start).Seconds())
	}
	t.Logf("mmread and tocsr %.3f s of processor, ReadMatrix with one parsing thread %.3f s of wall time: ratio %.1f", theirs, ours, theirs/ours)
}
