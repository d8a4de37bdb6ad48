package place_test

import (
	"context"
	"path/filepath"
	"testing"
	"time"

	"rowstead/cmd/internal/place"
	"rowstead/coordinator"
	"rowstead/coordinator/report"
	"rowstead/partition/audit"
	"rowstead/partition/matfile"
	"rowstead/partition/samples/problems"
)

const matrices = "../../../testdata/matrices/"

// open are the shipped square matrices; their origins stand in SOURCES.md.
var open = []struct {
	file     string
	singular bool // no x need exist: the right side is made from one
}{
	{"arctic_lap.mtx", false}, {"bcsstk01.mtx", false}, {"bcsstk02.mtx", false}, {"bcsstk16.mtx.gz", false},
	{"bcsstm01.mtx", true}, {"bunny_K.mtx", true}, {"bunny_M.mtx", false}, {"c9840.mtx.gz", false},
	{"fs_183_1.mtx", false}, {"jagmesh7_lap.mtx", false}, {"lfat5.mtx", false}, {"lund_a.mtx", false},
	{"mhd1280b_c.mtx.gz", true}, {"pores_1.mtx", false}, {"us_counties_lap.mtx", false}, {"uscounties.mtx", true},
	{"utm300.mtx", false}, {"young1c.mtx", false},
}

// The whole way from file to answer on every shipped square matrix, with the
// method left to the program and with the sketched one forced: an answer met,
// and an audit from the files by its own path that confirms it.
func TestOpenMatrices(t *testing.T) {
	for _, o := range open {
		if testing.Short() && o.file == "uscounties.mtx" {
			continue // thousands of products
		}
		for _, kind := range []string{coordinator.Auto, "sketched"} {
			t.Run(o.file+" "+kind, func(t *testing.T) {
				right := rightSide(t, matrices+o.file)
				rec := solve(t, matrices+o.file, right, kind)
				// uscounties has no diagonal at all and numbers of full rank only in
				// name; an honest short is an answer there.
				if rec.Verdict != report.Met && !(o.file == "uscounties.mtx" && rec.Verdict == report.Short && rec.Reason != "") {
					t.Errorf("verdict %s, %q", rec.Verdict, rec.Reason)
				}
			})
		}
	}
}

// rightSide writes b = A·v for a random v, so that singular matrices have an
// answer too; A·1 all but vanishes for Laplacians.
func rightSide(t *testing.T, path string) string {
	t.Helper()
	a, head, err := matfile.ReadMatrix(path, matfile.Options{})
	if err != nil {
		t.Fatal(err)
	}
	b := make([]float64, a.Rows)
	a.Mul(b, problems.NormalVector(a.Cols, 7))
	out := filepath.Join(t.TempDir(), "b.mtx")
	if err := matfile.WriteDense(out, &matfile.Dense{Rows: a.Rows, Cols: 1, Complex: head.Complex, Values: b}, matfile.WriteOptions{}); err != nil {
		t.Fatal(err)
	}
	return out
}

func solve(t *testing.T, matrix, right, kind string) *report.Record {
	t.Helper()
	rec, _ := solveTo(t, matrix, right, kind)
	return rec
}

// solveTo runs a job, checks its verdict by an audit, and returns the path of
// the answer too.
func solveTo(t *testing.T, matrix, right, kind string) (*report.Record, string) {
	t.Helper()
	out := filepath.Join(t.TempDir(), "x.mtx")
	rec := report.New("solve")
	err := coordinator.Run(context.Background(), coordinator.Job{
		Matrix: matrix, Right: right, Out: out, Tolerance: 1e-8,
		Method: kind, Precondition: coordinator.Auto, Basis: coordinator.Auto, Seed: 1, Threads: 2,
		TimeLimit: 2 * time.Minute,
	}, coordinator.Rim{
		Place: place.InProcess, Now: time.Now,
		FreeMemory: func() (int64, error) { return 4 << 30, nil }, PeakMemory: func() int64 { return 0 },
		Phase: func(string) {}, Opened: func(*report.Record) {}, Progress: func(report.Progress) {},
		Stop: func() string { return "" }, Snapshot: func(int, [][]float64) error { return nil },
	}, rec)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%s by %s with %s: %d products, true %.1e, scaled %.1e %s", rec.Verdict, rec.Method, rec.Precondition, rec.Products, float64(rec.Residuals.True), float64(rec.Residuals.Scaled), rec.Reason)
	answer := out
	if rec.Verdict != report.Met {
		answer = coordinator.ShortName(out)
	}
	check, err := audit.Check(context.Background(), audit.Files{Matrix: matrix, Right: right, Answer: answer}, audit.Options{Tolerance: 1e-8})
	if err != nil {
		t.Fatal(err)
	}
	if check.Met != (rec.Verdict == report.Met) {
		t.Errorf("verdict %s, the audit says met %v", rec.Verdict, check.Met)
	}
	return rec, answer
}
