package place_test

import (
	"context"
	"math"
	"strings"
	"testing"

	"rowstead/cmd/internal/place"
	"rowstead/coordinator"
	"rowstead/coordinator/method"
	"rowstead/coordinator/report"
	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
)

// A contradiction that is certain is named, and the answer is the best there
// is: its residual is the part of b that no x can meet.
func TestContradictions(t *testing.T) {
	closed := problems.Neumann2D(100)
	random := problems.NormalVector(closed.Rows, 5)
	sum, size := 0.0, 0.0
	for _, v := range random {
		sum += v
		size = math.Hypot(size, v)
	}
	hollow := problems.Poisson2D(40)
	hollow = without(hollow, 7)
	ones := make([]float64, hollow.Rows)
	onesSize := math.Sqrt(float64(len(ones)))
	for i := range ones {
		ones[i] = 1
	}
	for _, c := range []struct {
		name  string
		a     *csr.Matrix
		b     []float64
		floor float64
		says  string
	}{
		{"closed grid", closed, random, math.Abs(sum) / math.Sqrt(float64(len(random))) / size, "every column sums to zero"},
		{"empty row", hollow, ones, 1 / onesSize, "row 8"},
	} {
		j := write(t, c.a, c.b)
		d := &desk{place: place.InProcess}
		rec := report.New("solve")
		if err := coordinator.Run(context.Background(), j, d.rim(), rec); err != nil {
			t.Fatal(err)
		}
		left := float64(rec.Residuals.True)
		t.Logf("%s: %s %q, %d products, residual %.3e, floor %.3e; %s", c.name, rec.Verdict, rec.Reason, rec.Products, left, c.floor, rec.Advice)
		if rec.Verdict != report.Short || rec.Reason != method.ReasonContradictory || !strings.Contains(rec.Advice, c.says) {
			t.Errorf("%s: %s %q, advice %q", c.name, rec.Verdict, rec.Reason, rec.Advice)
		}
		if left < 0.999*c.floor || left > 1.001*c.floor {
			t.Errorf("%s: residual %.4e left, the best possible is %.4e", c.name, left, c.floor)
		}
	}
}

// without is a with row r emptied.
func without(a *csr.Matrix, r int) *csr.Matrix {
	entries := &csr.Triplets{}
	for i := range a.Rows {
		cols, vals := a.Row(i)
		for k, c := range cols {
			if i != r {
				entries.Add(i, int(c), vals[k])
			}
		}
	}
	return entries.Matrix(a.Rows, a.Cols)
}
