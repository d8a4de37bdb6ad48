package place_test

import (
	"context"
	"math"
	"testing"

	"rowstead/cmd/internal/place"
	"rowstead/coordinator"
	"rowstead/coordinator/report"
	"rowstead/partition/audit"
	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
)

// Whatever powers of two stand before A and b, the verdict is that on the
// answer that can be written down: met where x can be, short where x leaves the
// range of numbers. A right side that would vanish in scaled rows is not b = 0.
func TestExtremeUnits(t *testing.T) {
	for _, c := range []struct {
		name string
		a, b int // powers of two
		met  bool
	}{
		{"plain", 0, 0, true},
		{"both tiny", -900, -900, true},
		{"both huge", 900, 900, true},
		{"huge A, tiny b", 900, -900, false},
		{"b near the bottom", 0, -1040, true},
		{"b subnormal", 0, -1062, false}, // x keeps few of its digits
		{"tiny A, huge b", -500, 600, false},
		{"A up, b down", 400, -400, true},
	} {
		a := problems.Poisson2D(20)
		b := problems.NormalVector(a.Rows, 5)
		scale(a, b, c.a, c.b)
		j := write(t, a, b)
		d := &desk{place: place.InProcess}
		rec := report.New("solve")
		if err := coordinator.Run(context.Background(), j, d.rim(), rec); err != nil {
			t.Fatal(err)
		}
		t.Logf("%s: %s %q, true %g, scaled %g", c.name, rec.Verdict, rec.Reason, float64(rec.Residuals.True), float64(rec.Residuals.Scaled))
		if (rec.Verdict == report.Met) != c.met || (rec.Reason == "") != c.met {
			t.Errorf("%s: %s %q, want met %v", c.name, rec.Verdict, rec.Reason, c.met)
		}
		answer := j.Out
		if !c.met {
			answer = coordinator.ShortName(j.Out)
		}
		check, err := audit.Check(context.Background(), audit.Files{Matrix: j.Matrix, Right: j.Right, Answer: answer}, audit.Options{Tolerance: 1e-8})
		if err != nil {
			t.Fatal(err)
		}
		if check.Met != c.met {
			t.Errorf("%s: the audit says met %v", c.name, check.Met)
		}
	}
}

func scale(a *csr.Matrix, b []float64, ka, kb int) {
	for k := range a.Val {
		a.Val[k] = math.Ldexp(a.Val[k], ka)
	}
	for i := range b {
		b[i] = math.Ldexp(b[i], kb)
	}
}
