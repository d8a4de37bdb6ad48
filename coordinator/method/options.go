package method

// Names of the methods, as flags and records spell them.
const (
	Auto       = "auto"
	Sketched   = "sketched"
	Orthogonal = "orthogonal"
	CG         = "cg"
)

// Options steer a solve; the zero value of every field is its default.
type Options struct {
	Method      string    // Auto
	Tolerance   float64   // of the true and the scaled residual; 1e-8
	Window      int       // vectors of a window step; 4
	Cycle       int       // most steps of a cycle; 300
	SketchRows  int       // 4·(Cycle + 2·Recycle + 4), rounded up to a multiple of 8·Zeta
	Zeta        int       // nonzeros of the sketch a row; 4
	Recycle     int       // harmonic Ritz vectors kept between cycles; 16, negative: none
	Seed        uint64    // of every random choice
	Form        BasisForm // Double
	MaxProducts int       // give up after so many products; 0: no limit
	// Symmetric says that the file declares A symmetric or that its values are;
	// Auto takes CG only then.
	Symmetric bool
	// DefinitePreconditioner says that M is symmetric positive definite when A is.
	DefinitePreconditioner bool
	// Stop is asked before every step. A text that is not empty ends the run
	// with the best x so far and that text as the reason.
	Stop func() string
	// Observe is told of progress after every panel of steps and every check.
	Observe func(Progress)
	// Behind starts a task beside the recurrence and returns its wait function.
	// nil runs the task at once; the bits are the same either way.
	Behind func(task func()) (wait func())

	handOver bool // Auto's own: another method follows where this one is slow
}

// Progress is how far a solve has come. Estimate is of the same kind as True
// and comes from a sketch; True is the last recomputed one.
type Progress struct {
	Products, Steps, Cycles int
	True                    float64 // ‖b − A·x‖/‖b‖ of the current x
	Scaled                  float64
	Estimate                float64
	Condition               float64 // of the sketched basis
	Note                    string  // what changed, for the record; mostly empty
}

// Reasons why a solve falls short. A reason is "" when the tolerance is met.
const (
	ReasonStagnated     = "stagnated"
	ReasonIndefinite    = "not positive definite" // of CG alone; another method may do
	ReasonFloor         = "floor of rounding"
	ReasonContradictory = "the equations contradict each other"
	ReasonProducts      = "limit of products"
	ReasonNotFinite     = "not a finite number"
)

// Result is what a solve achieved; x stays in the Space.
type Result struct {
	Met       bool
	Reason    string // one of the Reasons, or Stop's text
	Method    string // the one that finished
	Residuals Residuals

	Steps, FullSteps, Cycles, Products int

	ConditionHint float64 // a lower bound of cond(D·A), 0 if unknown
	ForwardError  float64 // estimate of ‖x − x̂‖/‖x‖ from the hint
	SketchRows    int
	Story         []Event
}

// Event is one line of what happened, for the record.
type Event struct {
	Cycle, Step, Products int
	Text                  string
}
