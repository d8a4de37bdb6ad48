package place_test

import (
	"context"
	"errors"
	"math"
	"os"
	"path/filepath"
	"testing"
	"time"

	"go.uber.org/goleak"

	"rowstead/cmd/internal/place"
	"rowstead/coordinator"
	"rowstead/coordinator/report"
	"rowstead/partition/audit"
	"rowstead/partition/csr"
	"rowstead/partition/matfile"
	"rowstead/partition/samples"
)

// desk is the outside world of a Run in a test: a clock that goes on by a
// millisecond a look, and what the run kept.
type desk struct {
	ticks     int
	stop      func() string
	phases    []string
	snapshots int
	x         [][]float64
	place     func(context.Context, coordinator.Placement) (coordinator.Placed, error)
}

func (d *desk) rim() coordinator.Rim {
	return coordinator.Rim{
		Place: d.place,
		Now: func() time.Time {
			d.ticks++
			return time.Unix(0, 0).Add(time.Duration(d.ticks) * time.Millisecond)
		},
		FreeMemory: func() (int64, error) { return 1 << 32, nil },
		PeakMemory: func() int64 { return 1 },
		Phase:      func(state string) { d.phases = append(d.phases, state) },
		Opened:     func(*report.Record) {},
		Progress:   func(report.Progress) {},
		Stop: func() string {
			if d.stop == nil {
				return ""
			}
			return d.stop()
		},
		Snapshot: func(_ int, x [][]float64) error {
			d.snapshots++
			d.x = x
			return nil
		},
	}
}

// write puts a system into files and returns the job that solves it.
func write(t *testing.T, a *csr.Matrix, columns ...[]float64) coordinator.Job {
	t.Helper()
	folder := t.TempDir()
	j := coordinator.Job{Matrix: filepath.Join(folder, "A.mtx"), Right: filepath.Join(folder, "b.mtx"), Out: filepath.Join(folder, "x.mtx"), Tolerance: 1e-8, Seed: 1}
	d := &matfile.Dense{Rows: a.Rows, Cols: len(columns)}
	for _, c := range columns {
		d.Values = append(d.Values, c...)
	}
	if err := errors.Join(matfile.WriteMatrix(j.Matrix, a, matfile.WriteOptions{}), matfile.WriteDense(j.Right, d, matfile.WriteOptions{})); err != nil {
		t.Fatal(err)
	}
	return j
}

// job writes a model job.
func job(t *testing.T, name string, size int) coordinator.Job {
	t.Helper()
	m, err := samples.New(name, size)
	if err != nil {
		t.Fatal(err)
	}
	return write(t, m.Matrix, m.Right)
}

// run carries out a job at d and leaves no goroutine behind.
func run(t *testing.T, j coordinator.Job, d *desk) (*report.Record, error) {
	t.Helper()
	defer goleak.VerifyNone(t, goleak.IgnoreCurrent())
	if d.place == nil {
		d.place = place.InProcess
	}
	rec := report.New("solve")
	err := coordinator.Run(context.Background(), j, d.rim(), rec)
	return rec, err
}

// audited demands that the files themselves confirm the verdict.
func audited(t *testing.T, j coordinator.Job) {
	t.Helper()
	got, err := audit.Check(context.Background(), audit.Files{Matrix: j.Matrix, Right: j.Right, Answer: j.Out}, audit.Options{Tolerance: 1.0001 * j.Tolerance})
	if err != nil || !got.Met {
		t.Errorf("the audit says %+v, %v", got, err)
	}
}

// shuffled is a matrix whose rows and columns stand in an order that hides its
// band: row i of the band is row 37·i mod n.
func shuffled(n int) *csr.Matrix {
	var e csr.Triplets
	for i := range n {
		p := i * 37 % n
		e.Add(p, p, 4)
		if i+1 < n {
			q := (i + 1) * 37 % n
			e.Add(p, q, -1)
			e.Add(q, p, -1.5)
		}
	}
	return e.Matrix(n, n)
}

// A new order is undone in the answer, in one block and in several.
func TestOrderIsUndone(t *testing.T) {
	for _, blocks := range []int{1, 4} {
		b := make([]float64, 1000)
		for i := range b {
			b[i] = math.Sin(float64(i))
		}
		j := write(t, shuffled(1000), b)
		j.Blocks = blocks
		rec, err := run(t, j, &desk{})
		if err != nil || rec.Verdict != report.Met {
			t.Fatalf("%d blocks: %v %v %v", blocks, rec.Verdict, rec.Reason, err)
		}
		if choice(rec, "order") != "reversed" {
			t.Errorf("%d blocks: the order is %q", blocks, choice(rec, "order"))
		}
		audited(t, j)
	}
}

func choice(rec *report.Record, name string) string {
	for _, c := range rec.Choices {
		if c.Name == name {
			return c.Value
		}
	}
	return ""
}

// A symmetric matrix with a positive diagonal that is not definite: conjugate
// gradients are tried and give way.
func TestConjugateGradientsGiveWay(t *testing.T) {
	n := 400
	var e csr.Triplets
	b := make([]float64, n)
	for i := range n {
		e.Add(i, i, 1)
		b[i] = math.Cos(3 * float64(i))
		if i+1 < n {
			e.Add(i, i+1, 2)
			e.Add(i+1, i, 2)
		}
	}
	j := write(t, e.Matrix(n, n), b)
	j.Precondition = "none"
	rec, err := run(t, j, &desk{})
	if err != nil || rec.Verdict != report.Met || rec.Method == "cg" {
		t.Fatalf("%v by %v: %v, %v", rec.Verdict, rec.Method, rec.Reason, err)
	}
	audited(t, j)
}

// Several right sides, one of them zero; the worst one is what is reported.
func TestSeveralSides(t *testing.T) {
	b := make([]float64, 500)
	for i := range b {
		b[i] = 1
	}
	j := write(t, shuffled(500), b, make([]float64, 500), b)
	rec, err := run(t, j, &desk{})
	if err != nil || rec.Verdict != report.Met || len(rec.Sides) != 3 || rec.Sides[1].Residuals.True != 0 {
		t.Fatalf("%v %+v %v", rec.Verdict, rec.Sides, err)
	}
	audited(t, j)
}

// A run that is stopped keeps its answer as short and as a snapshot.
func TestStopKeepsTheAnswer(t *testing.T) {
	j := job(t, "plume", 4000)
	j.Method = "sketched"
	looks := 0
	d := &desk{stop: func() string {
		if looks++; looks > 12 {
			return coordinator.ReasonInterrupted
		}
		return ""
	}}
	rec, err := run(t, j, d)
	if err != nil || rec.Verdict != report.Short || rec.Reason != coordinator.ReasonInterrupted {
		t.Fatalf("%v %q %v", rec.Verdict, rec.Reason, err)
	}
	if d.snapshots != 1 || len(d.x) != 1 || rec.Answer != coordinator.ShortName(j.Out) {
		t.Errorf("%d snapshots of %d columns, answer %q", d.snapshots, len(d.x), rec.Answer)
	}
	if _, err := os.Stat(rec.Answer); err != nil {
		t.Error(err)
	}
	if _, err := os.Stat(j.Out); err == nil {
		t.Error("a short answer stands where a met one belongs")
	}
	// Carried on from the snapshot it is met.
	j.Start, j.OwnShort = d.x, true
	if rec, err = run(t, j, &desk{}); err != nil || rec.Verdict != report.Met {
		t.Errorf("carried on: %v %q %v", rec.Verdict, rec.Reason, err)
	}
}

// A time limit ends a run that would go on.
func TestTimeLimit(t *testing.T) {
	j := job(t, "plume", 4000)
	j.Method, j.TimeLimit = "sketched", 15*time.Millisecond
	rec, err := run(t, j, &desk{})
	if err != nil || rec.Verdict != report.Short || rec.Reason != coordinator.ReasonTime {
		t.Errorf("%v %q %v", rec.Verdict, rec.Reason, err)
	}
}

// An input whose hash differs is refused before it is read.
func TestChangedInput(t *testing.T) {
	j := job(t, "plume", 400)
	j.Hashes = map[string]string{"matrix": "0"}
	var input *coordinator.InputError
	if _, err := run(t, j, &desk{}); !errors.As(err, &input) {
		t.Errorf("got %v", err)
	}
}

// When rows cannot be placed the run ends with that error and writes nothing.
func TestPlaceFails(t *testing.T) {
	j := job(t, "plume", 400)
	broken := errors.New("no worker is there")
	d := &desk{place: func(context.Context, coordinator.Placement) (coordinator.Placed, error) { return nil, broken }}
	if _, err := run(t, j, d); !errors.Is(err, broken) {
		t.Errorf("got %v", err)
	}
	if _, err := os.Stat(j.Out); err == nil {
		t.Error("an answer was written")
	}
}

// Every choice has a value, and what the program chose has a reason or speaks
// for itself.
func TestChoicesAreExplained(t *testing.T) {
	j := job(t, "plume", 2000)
	j.Method = "sketched"
	rec, err := run(t, j, &desk{})
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"method", "precondition", "order", "scaling", "blocks", "cycle", "basis", "sketch", "window", "memory", "threads"} {
		if choice(rec, name) == "" {
			t.Errorf("nothing is said of %s", name)
		}
	}
	if rec.Traffic.CoordinatorBytesPerStep <= 0 || len(rec.Workers) != 1 || rec.Workers[0].PeakBytes <= 0 {
		t.Errorf("traffic %v, workers %+v", rec.Traffic, rec.Workers)
	}
}
