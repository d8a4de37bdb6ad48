package report

import "encoding/json"

// object is what --json prints, field for field in this order. Residuals
// that were not measured are null; counts and times of what never ran are
// zero, lists are empty.
type object struct {
	Verdict       string         `json:"verdict"`
	Reason        string         `json:"reason"`
	Error         string         `json:"error"`
	Rows          int            `json:"rows"`
	Columns       int            `json:"columns"`
	Entries       int            `json:"entries"`
	Method        string         `json:"method"`
	Precondition  string         `json:"precondition"`
	Cuts          []int          `json:"cuts"`
	RowBase       int            `json:"row_base"` // from where cuts and first_row count
	Workers       []workerObject `json:"workers"`
	Tolerance     Number         `json:"tolerance"`
	True          Number         `json:"true_residual"`
	Scaled        Number         `json:"scaled_residual"`
	RowWise       Number         `json:"rowwise_error"`
	Backward      Number         `json:"backward_error"`
	ConditionHint Number         `json:"condition_hint"`
	ForwardError  Number         `json:"forward_error"`
	Steps         int            `json:"steps"`
	FullSteps     int            `json:"full_steps"`
	Cycles        int            `json:"cycles"`
	Products      int            `json:"products"`
	Seconds       Seconds        `json:"seconds"`
	Traffic       Traffic        `json:"traffic"`
	PeakBytes     int64          `json:"coordinator_peak_bytes"`
	Seed          uint64         `json:"seed"`
	Answer        string         `json:"answer"`
	Record        string         `json:"record"`
	// Only a trial has the error against its known answer.
	KnownError *Number `json:"known_error,omitempty"`
	// Only where there is something to say: of other short answers.
	AnswerNote string `json:"answer_note,omitempty"`
}

type workerObject struct {
	Name      string `json:"name"`
	FirstRow  int    `json:"first_row"`
	Rows      int    `json:"rows"`
	Entries   int    `json:"entries"`
	PeakBytes int64  `json:"peak_bytes"`
}

// JSON returns the one object of the run on one line, with a newline at its
// end. It is valid JSON whatever the record holds.
func (r *Record) JSON() []byte {
	o := object{
		Verdict: r.Verdict, Reason: r.Reason, Error: r.Error,
		Rows: r.Rows, Columns: r.Columns, Entries: r.Entries,
		Method: r.Method, Precondition: r.Precondition, Cuts: r.Cuts, RowBase: r.RowBase,
		Workers: make([]workerObject, len(r.Workers)), Tolerance: r.Tolerance,
		True: r.Residuals.True, Scaled: r.Residuals.Scaled, RowWise: r.Residuals.RowWise,
		Backward: r.Residuals.Backward, ConditionHint: r.Residuals.ConditionHint, ForwardError: r.Residuals.ForwardError,
		Steps: r.Steps, FullSteps: r.FullSteps, Cycles: r.Cycles, Products: r.Products,
		Seconds: r.Seconds, Traffic: r.Traffic, PeakBytes: r.CoordinatorPeakBytes,
		Seed: r.Seed, Answer: r.Answer, Record: r.Path, AnswerNote: r.AnswerNote,
	}
	if o.Cuts == nil {
		o.Cuts = []int{}
	}
	for i, w := range r.Workers {
		o.Workers[i] = workerObject(w)
	}
	if r.KnownError.Finite() {
		o.KnownError = &r.KnownError
	}
	return line(o)
}

// line encodes v on one line. The types of this package always encode: every
// float is a Number and texts are made valid by the encoder.
func line(v any) []byte {
	out, err := json.Marshal(v)
	if err != nil {
		panic("report: a record that does not encode")
	}
	return append(out, '\n')
}

// Encode returns the whole record as indented JSON, as it is kept.
func (r *Record) Encode() []byte {
	out, err := json.MarshalIndent(r, "", "  ")
	if err != nil {
		panic("report: a record that does not encode")
	}
	return append(out, '\n')
}
