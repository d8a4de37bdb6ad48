//go:build outside

package place_test

import (
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"rowstead/coordinator"
	"rowstead/coordinator/report"
)

// beside solves the same system with SciPy: a direct solve, restarted GMRES and
// BiCGSTAB with an incomplete factor, what each claims and the true residual of
// each, and what SciPy's own product says of our answer. far is the distance of
// our answer from the direct one, condition the 1-norm estimate of A.
const beside = `
import sys, json, warnings, numpy as np, scipy.sparse as sp, scipy.sparse.linalg as sl, scipy.io as sio
warnings.simplefilter('ignore')
matrix, right, answer = sys.argv[1:4]
A = sp.csc_matrix(sio.mmread(matrix)); b = np.asarray(sio.mmread(right)).ravel(); x = np.asarray(sio.mmread(answer)).ravel()
norm = lambda v: float(np.linalg.norm(v))
res = lambda v: norm(b - A @ v) / norm(b) if np.isfinite(v).all() else -1.0
out = {'ours': res(x)}
try:
    lu = sl.splu(A); d = lu.solve(b)
    inverse = sl.LinearOperator(A.shape, matvec=lu.solve, rmatvec=lambda v: lu.solve(v, 'H'), dtype=A.dtype)
    out['direct'] = res(d); out['far'] = norm(x - d) / norm(d)
    out['condition'] = float(sl.onenormest(A) * sl.onenormest(inverse))
except RuntimeError as e:
    out['singular'] = str(e)
try:
    ilu = sl.spilu(A, 1e-4, 10); M = sl.LinearOperator(A.shape, ilu.solve, dtype=A.dtype)
except RuntimeError:
    M = None
for name, call in (('gmres', lambda: sl.gmres(A, b, tol=1e-8, restart=50, maxiter=40, M=M)), ('bicgstab', lambda: sl.bicgstab(A, b, tol=1e-8, maxiter=2000, M=M))):
    v, code = call(); out[name] = {'claims': code == 0, 'true': res(v)}
print(json.dumps(out))
`

type claim struct {
	Claims bool
	True   float64
}

// SciPy side by side on every shipped square matrix: its product bears out our
// verdict, and where A is regular our answer lies as close to that of its direct
// solve as the condition allows.
func TestBesideSciPy(t *testing.T) {
	script := filepath.Join(t.TempDir(), "beside.py")
	if err := os.WriteFile(script, []byte(beside), 0o600); err != nil {
		t.Fatal(err)
	}
	for _, o := range open {
		t.Run(o.file, func(t *testing.T) {
			right := rightSide(t, matrices+o.file)
			rec, answer := solveTo(t, matrices+o.file, right, coordinator.Auto)
			text, err := exec.Command("python3", script, matrices+o.file, right, answer).Output()
			if err != nil {
				t.Fatalf("python3 with scipy: %v", err)
			}
			var got struct {
				Ours, Direct, Far, Condition float64
				Singular                     string
				Gmres, Bicgstab              claim
			}
			if err := json.Unmarshal(text, &got); err != nil {
				t.Fatal(err)
			}
			t.Logf("ours %s %.1e | direct %.1e %s| gmres claims %v, true %.1e | bicgstab claims %v, true %.1e | condition %.0e, far %.1e",
				rec.Verdict, got.Ours, got.Direct, got.Singular, got.Gmres.Claims, got.Gmres.True, got.Bicgstab.Claims, got.Bicgstab.True, got.Condition, got.Far)
			if rec.Verdict == report.Met && !(got.Ours <= 1.01e-8) {
				t.Errorf("met, but SciPy's product gives a residual of %.2e", got.Ours)
			}
			if o.singular || got.Singular != "" {
				return
			}
			// ‖δx‖/‖x‖ ≤ cond₂·‖r‖/‖b‖, and cond₂ ≤ √n·cond₁; both answers count.
			if limit := 100 * got.Condition * (got.Ours + got.Direct + 1e-16); got.Far > limit {
				t.Errorf("%.1e from the direct answer, the condition allows %.1e", got.Far, limit)
			}
		})
	}
}
