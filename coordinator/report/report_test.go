package report

import (
	"encoding/json"
	"encoding/xml"
	"flag"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

var update = flag.Bool("update", false, "write the golden files again")

// metRecord is a run as it may end: two right sides, both met.
func metRecord() *Record {
	r := New("solve")
	r.ID, r.Path = "20260301-081500-dam", "/home/ana/.local/state/rowstead/runs/20260301-081500-dam/record.json"
	r.Started = time.Date(2026, 3, 1, 8, 15, 0, 0, time.UTC)
	r.Program = Program{Version: "1.0", Go: "go1.26", System: "linux/amd64", Processor: "test", Threads: 2}
	r.Inputs = []Input{{Role: "matrix", Path: "/data/dam.mtx", Size: 1234, Hash: strings.Repeat("ab", 32)}}
	r.Rows, r.Columns, r.Entries = 300, 300, 3155
	r.Precondition, r.Basis, r.Seed, r.Tolerance = "ilu0", "double", 1, 1e-8
	r.Cuts = []int{0, 152, 300}
	r.Workers = []Worker{{Name: "block 1", Rows: 152, Entries: 1600, PeakBytes: 1 << 20}, {Name: "block 2", FirstRow: 152, Rows: 148, Entries: 1555, PeakBytes: 1 << 20}}
	r.Choices = []Choice{
		{Name: "method", Value: "orthogonal", Reason: "fewer than 5000 unknowns: sketching is for long problems"},
		{Name: "precondition", Value: "ilu0", Reason: "the diagonal is there"},
		{Name: "blocks", Value: "2", Asked: true},
	}
	first := Unmeasured()
	first.True, first.Scaled, first.RowWise, first.Backward = 3.25e-9, 8.1e-9, 2e-12, 1e-13
	first.ConditionHint, first.ForwardError = 4.1e5, 3.3e-3
	first.Worst = []Row{{Row: 16, Error: 2e-12}, {Row: 203, Error: 1e-12}}
	second := first
	second.True = 1e-10
	second.Scaled = 1e-10
	r.Sides = []Side{
		{Column: 0, Verdict: Met, Method: "orthogonal", Residuals: first, Steps: 210, FullSteps: 4, Cycles: 1, Products: 212},
		{Column: 1, Verdict: Met, Method: "orthogonal", Residuals: second, Steps: 200, Cycles: 1, Products: 202},
	}
	r.Settle()
	r.Seconds = Seconds{Read: 0.125, Solve: 2, Total: 2.25}
	r.Story = []Event{{Cycle: 1, Step: 8, Products: 9, Text: "full every 16 steps: condition <2e4>"}}
	r.Curve = []Point{{0, 0, 1, Unknown()}, {100, 1, 1, 1e-4}, {212, 2, 3.25e-9, 3e-9}}
	r.Answer = "x.mtx"
	return r
}

// shortRecord fell short and holds numbers that JSON does not know.
func shortRecord() *Record {
	r := metRecord()
	r.Sides = r.Sides[:1]
	r.Sides[0].Verdict, r.Sides[0].Reason = Short, "stagnated"
	r.Sides[0].Residuals.True = Number(math.Inf(1))
	r.Sides[0].Residuals.ForwardError = Unknown()
	r.Answer, r.Advice = "x.short.mtx", "--precondition ilut"
	r.Settle()
	return r
}

// refusedRecord is what a usage error leaves.
func refusedRecord() *Record {
	r := New("solve")
	r.Tolerance = 1e-8
	r.Reason, r.Error = "bad input", "b.mtx: line 3: expected a number"
	return r
}

func golden(t *testing.T, name string, got []byte) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), string(got)); diff != "" {
		t.Errorf("%s differs (-want +got):\n%s", name, diff)
	}
}

func TestGolden(t *testing.T) {
	for name, r := range map[string]*Record{"met": metRecord(), "short": shortRecord(), "refused": refusedRecord()} {
		golden(t, name+".json", r.JSON())
		golden(t, name+".txt", []byte(r.Text()))
		golden(t, name+".html", []byte(r.HTML()))
		golden(t, name+".record", r.Encode())
	}
}

// The contract: these keys, all of them, whatever the status.
func TestObjectKeys(t *testing.T) {
	want := strings.Fields(`verdict reason error rows columns entries method precondition cuts row_base workers tolerance
		true_residual scaled_residual rowwise_error backward_error condition_hint forward_error steps full_steps
		cycles products seconds traffic coordinator_peak_bytes seed answer record`)
	for _, r := range []*Record{metRecord(), shortRecord(), refusedRecord(), New("audit")} {
		text := r.JSON()
		var got map[string]any
		if err := json.Unmarshal(text, &got); err != nil {
			t.Fatalf("%v in %s", err, text)
		}
		if len(got) != len(want) {
			t.Errorf("%d keys, want %d: %s", len(got), len(want), text)
		}
		for _, key := range want {
			if _, there := got[key]; !there {
				t.Errorf("key %s is missing in %s", key, text)
			}
		}
		if strings.Count(string(text), "\n") != 1 {
			t.Errorf("not one line: %q", text)
		}
	}
}

// The caution stands in every summary; the verdict is its first word.
func TestTextLaws(t *testing.T) {
	for _, r := range []*Record{metRecord(), shortRecord(), refusedRecord()} {
		text := r.Text()
		if !strings.Contains(strings.Join(strings.Fields(text), " "), Caution) {
			t.Errorf("no caution in %s", text)
		}
		if !strings.HasPrefix(text, r.Verdict+":") {
			t.Errorf("verdict %s is not the first word of %s", r.Verdict, text)
		}
	}
}

// The worst side decides verdict and residuals.
func TestSettle(t *testing.T) {
	r := metRecord()
	r.Sides[1].Verdict, r.Sides[1].Reason = Short, "stagnated"
	r.Settle()
	if r.Verdict != Short || r.Reason != "stagnated" || r.Residuals.True != 1e-10 || r.Products != 414 {
		t.Errorf("got %s %q %v %d", r.Verdict, r.Reason, r.Residuals.True, r.Products)
	}
}

// A record reads back as it was written, unknown numbers included.
func TestRecordRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		r := metRecord()
		r.Residuals.True = Number(rapid.Float64().Draw(t, "true"))
		r.Curve[0].Estimate = Number(rapid.Float64().Draw(t, "estimate"))
		r.Reason = rapid.String().Draw(t, "reason")
		var back Record
		if err := json.Unmarshal(r.Encode(), &back); err != nil {
			t.Fatal(err)
		}
		if string(back.Encode()) != string(r.Encode()) {
			t.Fatalf("wrote %s, read back %s", r.Encode(), back.Encode())
		}
		if r.Residuals.True.Finite() && back.Residuals.True != r.Residuals.True {
			t.Fatalf("%v became %v", r.Residuals.True, back.Residuals.True)
		}
	})
}

// Whatever the curve holds, the picture is well-formed XML.
func TestPictureWellFormed(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		r := New("solve")
		r.Tolerance = Number(rapid.Float64().Draw(t, "tolerance"))
		for range rapid.IntRange(0, 20).Draw(t, "points") {
			r.Curve = append(r.Curve, Point{rapid.IntRange(0, 1e9).Draw(t, "products"), 0,
				Number(rapid.Float64().Draw(t, "true")), Number(rapid.Float64().Draw(t, "estimate"))})
		}
		text := r.Picture()
		decoder := xml.NewDecoder(strings.NewReader(text))
		for {
			_, err := decoder.Token()
			if err == io.EOF {
				break
			}
			if err != nil {
				t.Fatalf("%v in %s", err, text)
			}
		}
		if strings.Contains(text, "NaN") || strings.Contains(text, "Inf") {
			t.Fatalf("a coordinate is not a number: %s", text)
		}
	})
}

func TestSentence(t *testing.T) {
	for _, c := range []struct {
		p    Progress
		want string
	}{
		{Progress{Products: 240, Left: 8e-5, Estimated: 6e-5, Remaining: 180}, "240 products; 8e-5 of b left, 6e-5 estimated; about 3 min"},
		{Progress{Products: 40, Left: 1, Estimated: 6e-5, Remaining: Unknown()}, "40 products; 6e-5 of b left, estimated"},
		{Progress{Products: 1, Left: Unknown(), Remaining: Unknown()}, "1 product"},
		{Progress{Products: 3, Left: 0.5, Estimated: Unknown(), Remaining: Unknown(), Column: 1, Columns: 3}, "right side 2 of 3: 3 products; 0.5 of b left"},
	} {
		if got := c.p.Sentence(); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}

func TestSpan(t *testing.T) {
	for _, c := range []struct {
		seconds float64
		want    string
	}{{0.01, "0.01 s"}, {0.31, "0.3 s"}, {42, "42 s"}, {180, "3 min"}, {7500, "2 h 5 min"}, {300000, "3 days"}, {math.NaN(), "unknown time"}} {
		if got := Span(c.seconds); got != c.want {
			t.Errorf("Span(%v) = %q, want %q", c.seconds, got, c.want)
		}
	}
}

// On a residual that falls by a constant factor a second, the time left is exact.
func TestPace(t *testing.T) {
	p := Pace{Tolerance: 1e-8}
	if p.Remaining().Finite() {
		t.Error("an estimate from nothing")
	}
	for i := range 11 {
		p.Add(float64(i), Number(math.Pow(10, -float64(i)/5)))
	}
	if got := float64(p.Remaining()); math.Abs(got-30) > 1e-9 {
		t.Errorf("got %v s, want 30 s", got)
	}
	for i := range 80 {
		p.Add(float64(11+i), 1e-2)
	}
	if got := p.Remaining(); got.Finite() {
		t.Errorf("got %v s while nothing falls", got)
	}
}
