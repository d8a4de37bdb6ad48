// Package report holds the record of a run and everything that is said from it:
// the JSON object, the summary for a person, the progress sentence, and the
// convergence picture.
//
// A Record is filled by whoever runs the solve and then only read. Residuals
// are relative and without unit, times are seconds, sizes are bytes, rows count
// from zero (the summary says "row 1" for the first one, as files do). The
// package is pure: it reads no clock, writes no file, starts no goroutine and
// asks no terminal. A Record may be read from many goroutines.
package report

import (
	"math"
	"time"
)

// Verdicts.
const (
	Met   = "met"
	Short = "short"
	None  = "none"
)

// States of a run.
const (
	Placing   = "placing"
	Preparing = "preparing"
	Stepping  = "stepping"
	Checking  = "checking"
	Finished  = "finished"
	BrokenOff = "broken off"
)

// Format is the version of the record's layout. A reader refuses a newer one.
const Format = 1

// Caution stands at the end of everything a person reads.
const Caution = "A solved system is not a checked design: the responsible engineer decides. " +
	"Local codes apply, and work that needs a licensed engineer still needs one."

// Record is all that is kept of a run. New returns one with nothing measured.
type Record struct {
	Format  int
	ID      string // name of the run's folder; empty when no record is kept
	Job     string // "solve" or "audit"
	State   string // of the run, one of the States
	Program Program
	Started time.Time
	Folder  string // working folder, absolute
	// Asked are the flags that were given, by name, with their texts.
	Asked  map[string]string
	Inputs []Input

	Rows, Columns, Entries int
	// Complex says that they are those of the real form, twice the file's.
	Complex bool `json:",omitempty"`
	// RowBase is from where rows count in the record and the object: 0. Text counts
	// from 1, as files do.
	RowBase      int
	Method       string
	Precondition string
	Basis        string
	Cuts         []int
	Workers      []Worker
	Choices      []Choice
	Seed         uint64

	Verdict   string // Met, Short or None
	Reason    string // why it is not met, in plain words
	Error     string // what went wrong, where, what next
	Advice    string // what to try when it is short
	Tolerance Number
	Residuals Residuals
	Sides     []Side // one a right side, in the order of the file
	// KnownError is ‖x − 1‖/‖1‖ of a trial; not a number otherwise.
	KnownError Number

	Steps, FullSteps, Cycles, Products int
	Seconds                            Seconds
	Traffic                            Traffic
	CoordinatorPeakBytes               int64
	Story                              []Event
	Curve                              []Point

	Answer     string // as the user named it; empty when none was written
	AnswerNote string `json:",omitempty"` // what else is to be said of it
	AnswerHash string // SHA-256 of the answer file
	Path       string // of the record itself
	Resumed    int    // how often the run was carried on
}

// Program says what computed.
type Program struct {
	Version, Go, System, Processor string
	Threads                        int
}

// Input is one file that was read.
type Input struct {
	Role string // "matrix", "right side", "guess", "answer", "cuts"
	Path string // absolute
	Size int64  // bytes
	Hash string // SHA-256, hexadecimal
}

// Worker is what one worker held.
type Worker struct {
	Name      string
	FirstRow  int
	Rows      int
	Entries   int
	PeakBytes int64
}

// Choice is one setting, its value, and where it comes from.
type Choice struct {
	Name, Value, Reason string
	Asked               bool // by a flag; else the program chose it
}

// Residuals are recomputed measures of an answer; none comes from a sketch.
type Residuals struct {
	True     Number // ‖b − A·x‖₂/‖b‖₂ in the file's units
	Scaled   Number // the same with every row divided by its largest entry
	RowWise  Number // max |b − A·x|ᵢ/(|A|·|x| + |b|)ᵢ
	Backward Number // ‖b − A·x‖∞/(‖A‖∞‖x‖∞ + ‖b‖∞)
	// ConditionHint is a lower bound of the condition of the row-scaled matrix.
	ConditionHint Number
	ForwardError  Number // estimate of the relative error of x from the hint
	Worst         []Row  // the worst rows, worst first
}

// Row is one row and its row-wise error.
type Row struct {
	Row   int
	Error Number
}

// Side is the outcome for one right side.
type Side struct {
	Column    int // of the right side's file, from zero
	Verdict   string
	Reason    string
	Method    string
	Residuals Residuals

	Steps, FullSteps, Cycles, Products int
}

// Seconds are the wall time of the phases.
type Seconds struct {
	Read    Number `json:"read"`
	Place   Number `json:"place"`
	Prepare Number `json:"prepare"`
	Solve   Number `json:"solve"`
	Check   Number `json:"check"`
	Write   Number `json:"write"`
	Total   Number `json:"total"`
}

// Traffic is what a step moves between machines.
type Traffic struct {
	CoordinatorBytesPerStep Number `json:"coordinator_bytes_per_step"`
	HaloBytesPerStep        Number `json:"halo_bytes_per_step"`
}

// Event is one line of the story of a run.
type Event struct {
	Second              Number
	Column, Cycle, Step int
	Products            int
	Text                string
}

// Point is one point of the convergence picture.
type Point struct {
	Products int
	Second   Number
	True     Number // the last recomputed residual
	Estimate Number // from the sketch; not a number where there is none
}

// New returns the record of a run that has not measured anything: no verdict,
// every residual unknown.
func New(job string) *Record {
	return &Record{Format: Format, Job: job, Verdict: None, Residuals: Unmeasured(), KnownError: Unknown()}
}

// Unknown is the Number of what was not measured; JSON has null for it.
func Unknown() Number { return Number(math.NaN()) }

// Unmeasured are residuals of which nothing is known.
func Unmeasured() Residuals {
	u := Unknown()
	return Residuals{True: u, Scaled: u, RowWise: u, Backward: u, ConditionHint: u, ForwardError: u}
}

// Settle takes verdict, reason, residuals and counts from the right sides: the
// verdict is met when every side is, the residuals are those of the worst side,
// the counts are sums.
func (r *Record) Settle() {
	if len(r.Sides) == 0 {
		return
	}
	r.Verdict, r.Reason = Met, ""
	r.Steps, r.FullSteps, r.Cycles, r.Products = 0, 0, 0, 0
	worst := 0
	for i, s := range r.Sides {
		if s.Verdict != Met && r.Verdict == Met {
			r.Verdict, r.Reason = Short, s.Reason
		}
		r.Steps, r.FullSteps = r.Steps+s.Steps, r.FullSteps+s.FullSteps
		r.Cycles, r.Products = r.Cycles+s.Cycles, r.Products+s.Products
		if worse(s, r.Sides[worst]) {
			worst = i
		}
	}
	r.Residuals, r.Method = r.Sides[worst].Residuals, r.Sides[worst].Method
}

// worse orders sides: short before met, then by the larger of the two
// residuals, what is not finite first.
func worse(a, b Side) bool {
	if (a.Verdict == Met) != (b.Verdict == Met) {
		return a.Verdict != Met
	}
	return larger(a.Residuals) > larger(b.Residuals)
}

// larger is the larger of the two residuals of the verdict, +Inf when one is
// unknown.
func larger(r Residuals) float64 {
	if !r.True.Finite() || !r.Scaled.Finite() {
		return math.Inf(1)
	}
	return max(float64(r.True), float64(r.Scaled))
}
