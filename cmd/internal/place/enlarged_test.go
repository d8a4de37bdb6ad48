//go:build slow

package place_test

import (
	"path/filepath"
	"testing"

	"rowstead/coordinator/report"
	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

// Some of them enlarged to a length for which sketching is meant: copies in a
// row, each weakly tied to the next.
func TestEnlargedMatrices(t *testing.T) {
	for _, file := range []string{"pores_1.mtx", "us_counties_lap.mtx", "jagmesh7_lap.mtx", "bcsstk16.mtx.gz", "c9840.mtx.gz", "lund_a.mtx"} {
		t.Run(file, func(t *testing.T) {
			a, _, err := matfile.ReadMatrix(matrices+file, matfile.Options{})
			if err != nil {
				t.Fatal(err)
			}
			big := enlarged(a, (30000+a.Rows-1)/a.Rows)
			path := filepath.Join(t.TempDir(), "a.mtx")
			if err := matfile.WriteMatrix(path, big, matfile.WriteOptions{}); err != nil {
				t.Fatal(err)
			}
			if rec := solve(t, path, rightSide(t, path), "sketched"); rec.Verdict != report.Met || rec.Rows < 30000 {
				t.Errorf("verdict %s, %q on %d rows", rec.Verdict, rec.Reason, rec.Rows)
			}
		})
	}
}

// enlarged is copies of a along the diagonal; unknown i of a copy is tied to
// unknown i of the next by a thousandth of its diagonal.
func enlarged(a *csr.Matrix, copies int) *csr.Matrix {
	entries := &csr.Triplets{}
	for c := range copies {
		at := c * a.Rows
		for i := range a.Rows {
			cols, vals := a.Row(i)
			for k, j := range cols {
				entries.Add(at+i, at+int(j), vals[k])
			}
			if tie := 1e-3 * a.At(i, i); c+1 < copies {
				entries.Add(at+i, at+i, tie)
				entries.Add(at+i+a.Rows, at+i+a.Rows, tie)
				entries.Add(at+i, at+i+a.Rows, -tie)
				entries.Add(at+i+a.Rows, at+i, -tie)
			}
		}
	}
	return entries.Matrix(copies*a.Rows, copies*a.Rows)
}
