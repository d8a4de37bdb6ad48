package method

import "math"

// mode is a rung of the safe ladder: how the basis is built.
type mode int

const (
	windowMode    mode = iota // window steps, full steps by level
	fullMode                  // a full step each time
	classicalMode             // classical Gram-Schmidt, repeated, true dots
)

func (m mode) String() string {
	return [...]string{"window steps", "full steps", "classical steps"}[m]
}

// fullEvery is the distance of full steps at each level.
var fullEvery = [...]int{math.MaxInt, 16, 8, 1}

// Condition of the sketched basis at which the level rises and at which a
// cycle ends; measured, see the tables of the guide.
var (
	levelConditions       = [...]float64{1e4, 1e7, 1e10}
	singleLevelConditions = [...]float64{30, 1e3, 1e5}
)

// basisCondition ends a cycle; replayed vectors cannot be corrected by full
// steps and stop earlier.
const (
	basisCondition  = 1e12
	replayCondition = 1e8
)

// calmBasis is a basis condition that shows a whole cycle was built with more
// full steps than it needed.
const calmBasis = 1e4

// ladder remembers over the cycles how carefully the basis must be built.
type ladder struct {
	mode       mode
	level      int // of the next cycle's start
	least      int // no start below it: one there has lost its basis
	window     int
	stagnation int
	fixed      bool // window steps only: replayed vectors allow no others
}

// outcome is what a cycle's end says about its estimates.
type outcome struct {
	accepted  bool
	reduction float64 // of ‖D·r‖
	gap       float64 // true residual over the debiased estimate
	condEnded bool
	condition float64 // of the basis at the end
	start     int     // level at the start
	level     int     // reached
	raisedAt  int     // step of the last raise, 0: none
	steps     int
}

// climb draws the conclusions; it reports whether the run has stagnated.
func (l *ladder) climb(o outcome) (stagnated bool) {
	if l.mode == windowMode && !l.fixed {
		switch {
		case o.condEnded:
			l.level, l.window = o.level, min(maxWindow, 2*l.window)
			l.least = max(l.least, min(o.start+1, len(levelConditions)))
		case o.level > l.least && o.level == o.start && o.condition < calmBasis:
			l.level = o.level - 1
		case o.raisedAt > 0 && 10*o.raisedAt < 7*o.steps:
			l.level = max(0, o.level-1)
		}
	}
	if !o.accepted || o.gap > 10 || o.gap < 0.1 {
		l.next()
	}
	if o.accepted && o.reduction <= 0.98 {
		l.stagnation = 0
		return false
	}
	l.stagnation++
	switch l.stagnation {
	case 2, 3:
		l.next()
	}
	return l.stagnation >= 5
}

func (l *ladder) next() {
	if l.mode < classicalMode && !l.fixed {
		l.mode++
	}
}

// wantsFull says whether step j, counted from base, is a full step.
func wantsFull(m mode, level, j, base, window int) bool {
	switch m {
	case fullMode:
		return true
	case classicalMode:
		return false
	}
	return level > 0 && j > window && (j-base)%fullEvery[level] == 0
}
