package main

import (
	"fmt"
	"os"
	"runtime"
	"sort"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"rowstead/cmd/internal/quantity"
	"rowstead/coordinator"
	"rowstead/coordinator/method"
)

// solveFlags are the flags of solve, which resume reads again from a record.
type solveFlags struct {
	job       coordinator.Job
	indexBase int
	report    string
}

// bytesValue is a flag that takes a size.
type bytesValue struct{ n *int64 }

func (v bytesValue) String() string {
	if v.n == nil || *v.n == 0 {
		return ""
	}
	return fmt.Sprint(*v.n)
}

func (v bytesValue) Set(text string) (err error) {
	*v.n, err = quantity.Bytes(text)
	return err
}

func (bytesValue) Type() string { return "size" }

// timeValue is a flag that takes a time.
type timeValue struct{ d *time.Duration }

func (v timeValue) String() string {
	if v.d == nil || *v.d == 0 {
		return ""
	}
	return v.d.String()
}

func (v timeValue) Set(text string) (err error) {
	*v.d, err = quantity.Duration(text)
	return err
}

func (timeValue) Type() string { return "time" }

// defaults that are not zero.
const (
	defaultTolerance = 1e-8
	defaultOut       = "x.mtx"
	defaultSeed      = 1
	defaultSnapshot  = 5 * time.Minute
)

// mostHere is how many worker processes one machine is asked for at most.
const mostHere = 256

// Bounds of a sketch: below the least it embeds nothing, beyond the most it is
// longer than any cycle needs.
const leastSketch, mostSketch = 64, 1_000_000

// mostThreads is beyond the cores of any desktop machine.
const mostThreads = 4096

// add declares the flags in the order in which the help lists them.
func (s *solveFlags) add(f *pflag.FlagSet) {
	j := &s.job
	j.SnapshotEvery = defaultSnapshot
	f.Float64Var(&j.Tolerance, "tolerance", defaultTolerance, "both recomputed residuals must be at or below this `NUMBER` (1e-8)")
	f.StringVar(&j.Out, "out", defaultOut, "write the answer to `FILE` (x.mtx); an answer that falls short goes to x.short.mtx; .npy, .gz and .zst work")
	f.BoolVar(&j.Overwrite, "overwrite", false, "replace existing files")
	f.StringVar(&j.Guess, "guess", "", "begin from the vector in `FILE`")
	f.BoolVar(&j.Trial, "trial", false, "take b = A·(1, …, 1) and report the error against that known answer")
	f.StringVar(&j.Precondition, "precondition", "auto", "`KIND`: auto, none, diagonal, ilu0 or ilut")
	f.StringVar(&j.Method, "method", "auto", "`NAME`: auto, sketched, orthogonal or cg")
	f.IntVar(&j.Window, "window", 0, "make a window step orthogonal to the last `COUNT` vectors (4)")
	f.IntVar(&j.Cycle, "cycle", 0, "at most `COUNT` steps between corrections of x (300, or what the memory allows)")
	f.IntVar(&j.SketchRows, "sketch-rows", 0, "length of a sketch, `COUNT` from 64 (four times the cycle)")
	f.Uint64Var(&j.Seed, "seed", defaultSeed, "`NUMBER` that every random choice follows from (1)")
	f.IntVar(&j.Blocks, "blocks", 0, "cut the rows into `COUNT` blocks (1)")
	f.IntVar(&j.Here, "here", 0, "hold the blocks in `COUNT` worker processes on this machine, one each (none)")
	f.StringVar(&j.Cuts, "cuts", "", "take the first rows of the blocks from `FILE`")
	f.StringVar(&j.Basis, "basis", "auto", "keep the basis as `KIND`: auto, double, single or replay")
	f.Var(bytesValue{&j.Memory}, "memory", "use at most this `SIZE`, such as 6GB or 500MiB (70 % of what is free)")
	f.IntVar(&j.Threads, "threads", 0, "use `COUNT` cores (all)")
	f.Var(timeValue{&j.TimeLimit}, "time-limit", "stop after this `TIME`, such as 10m, and keep the answer so far")
	f.Var(timeValue{&j.SnapshotEvery}, "snapshot", "keep the answer so far every `TIME` (5m)")
	f.IntVar(&s.indexBase, "index-base", -1, "plain triplets count from `0|1`")
	f.StringVar(&s.report, "report", "", "write report.txt, report.json, report.html and convergence.svg to folder `DIR`")
}

// jsonAndQuiet declares what every run has for its output.
func (a *app) jsonAndQuiet(c *cobra.Command) {
	a.jsonFlag(c)
	c.Flags().BoolVar(&a.quiet, "quiet", false, "no progress; the summary is the verdict alone")
}

// check reports every fault of the values at once.
func (s *solveFlags) check(f *pflag.FlagSet) error {
	j := &s.job
	var faults []string
	fault := func(bad bool, format string, values ...any) {
		if bad {
			faults = append(faults, fmt.Sprintf(format, values...))
		}
	}
	fault(!(j.Tolerance > 0 && j.Tolerance < 1), "--tolerance %v: expected a number between 0 and 1", j.Tolerance)
	fault(j.Out == "", "--out: expected the name of a file")
	fault(!among(j.Precondition, "auto", "none", "diagonal", "ilu0", "ilut"), "--precondition %q: expected auto, none, diagonal, ilu0 or ilut", j.Precondition)
	fault(!among(j.Method, method.Auto, method.Sketched, method.Orthogonal, method.CG), "--method %q: expected auto, sketched, orthogonal or cg", j.Method)
	fault(!among(j.Basis, "auto", "double", "single", "replay"), "--basis %q: expected auto, double, single or replay", j.Basis)
	for name, value := range map[string]int{"window": j.Window, "cycle": j.Cycle, "blocks": j.Blocks, "here": j.Here, "threads": j.Threads} {
		fault(f.Changed(name) && value < 1, "--%s %d: expected a whole number from 1", name, value)
	}
	fault(j.Basis == "replay" && j.Method == method.Orthogonal, "--basis replay has window steps alone; take --method sketched with it")
	fault(f.Changed("sketch-rows") && (j.SketchRows < leastSketch || j.SketchRows > mostSketch), "--sketch-rows %d: expected between %d and %d", j.SketchRows, leastSketch, mostSketch)
	fault(j.Threads > mostThreads, "--threads %d: expected at most %d; this machine has %d cores", j.Threads, mostThreads, runtime.NumCPU())
	fault(j.Here > mostHere, "--here %d: expected at most %d worker processes", j.Here, mostHere)
	fault(j.Here > 0 && j.Blocks > 0, "--here and --blocks both say how many blocks there are; give one")
	fault(j.Blocks > 0 && j.Cuts != "", "--blocks and --cuts both say where blocks begin; give one")
	fault(j.Trial && j.Right != "", "--trial makes its own right side; leave %s out", j.Right)
	var err error
	j.IndexBase, err = base(s.indexBase, f.Changed("index-base"))
	fault(err != nil, "%v", err)
	if len(faults) == 0 {
		if j.Here > 0 && j.Cuts == "" {
			j.Blocks = j.Here
		}
		return nil
	}
	sort.Strings(faults)
	return usage("%s", strings.Join(faults, "; "))
}

func among(value string, allowed ...string) bool {
	for _, a := range allowed {
		if value == a {
			return true
		}
	}
	return false
}

// given are the flags that were set, as texts, as a record keeps them.
func given(f *pflag.FlagSet) map[string]string {
	asked := map[string]string{}
	f.Visit(func(flag *pflag.Flag) {
		switch flag.Name {
		case "json", "quiet", "overwrite", "help":
		default:
			asked[flag.Name] = flag.Value.String()
		}
	})
	return asked
}

// exists says that something has that name.
func exists(path string) bool {
	_, err := os.Lstat(path)
	return err == nil
}
