package report

import (
	"fmt"
	"math"
	"strings"
)

// Progress is how far a run has come. Left and Estimated are relative
// residuals: the last recomputed one and the one the sketch estimates.
type Progress struct {
	Products  int
	Left      Number
	Estimated Number
	// Remaining is the estimated time to the tolerance in seconds, unknown
	// when the residual does not fall.
	Remaining Number
	Column    int // of the right side, from zero
	Columns   int // right sides in all
}

// Sentence is the progress in one sentence: "240 products; 8e-5 of b left, 6e-5
// estimated; about 3 min".
func (p Progress) Sentence() string {
	var b strings.Builder
	if p.Columns > 1 {
		fmt.Fprintf(&b, "right side %d of %d: ", p.Column+1, p.Columns)
	}
	b.WriteString(plural(p.Products, "product"))
	estimated := p.Estimated.Finite() && p.Estimated > 0
	switch {
	case p.Left.Finite() && p.Left >= 1 && estimated:
		// Nothing was recomputed since the start: only the estimate moves.
		fmt.Fprintf(&b, "; %s of b left, estimated", short(p.Estimated, 1))
	case p.Left.Finite():
		fmt.Fprintf(&b, "; %s of b left", short(p.Left, 1))
		if estimated {
			fmt.Fprintf(&b, ", %s estimated", short(p.Estimated, 1))
		}
	}
	if p.Remaining.Finite() {
		b.WriteString("; about " + Span(float64(p.Remaining)))
	}
	return b.String()
}

// Span writes seconds as a person would: "0.3 s", "42 s", "3 min", "2 h 5 min",
// "3 days".
func Span(seconds float64) string {
	switch {
	case math.IsNaN(seconds) || seconds < 0:
		return "unknown time"
	case seconds < 0.095:
		return fmt.Sprintf("%.2g s", seconds)
	case seconds < 9.95:
		return fmt.Sprintf("%.1f s", seconds)
	case seconds < 99.5:
		return fmt.Sprintf("%.0f s", seconds)
	case seconds < 5970:
		return fmt.Sprintf("%.0f min", seconds/60)
	case seconds < 172800:
		minutes := int(seconds/60 + 0.5)
		return fmt.Sprintf("%d h %d min", minutes/60, minutes%60)
	}
	return fmt.Sprintf("%.0f days", seconds/86400)
}

// Pace estimates the time to the tolerance from the points seen so far: the
// slope of log(residual) against time over the last half of them. It is not
// safe for several goroutines.
type Pace struct {
	Tolerance float64
	points    []pacePoint
}

type pacePoint struct{ second, log float64 }

// pacePoints is how many points the slope is taken over at most.
const pacePoints = 64

// Add tells of a residual at a time in seconds; what is not positive and finite
// is passed over.
func (p *Pace) Add(second float64, residual Number) {
	if !residual.Finite() || residual <= 0 {
		return
	}
	if len(p.points) == pacePoints {
		p.points = append(p.points[:0], p.points[1:]...)
	}
	p.points = append(p.points, pacePoint{second, math.Log10(float64(residual))})
}

// Remaining is the seconds until the tolerance at the present slope, unknown
// before three points and while the residual does not fall.
func (p *Pace) Remaining() Number {
	half := p.points[len(p.points)/2:]
	if len(half) < 3 || p.Tolerance <= 0 {
		return Unknown()
	}
	var st, sl, stt, stl float64
	for _, q := range half {
		st, sl, stt, stl = st+q.second, sl+q.log, stt+q.second*q.second, stl+q.second*q.log
	}
	n := float64(len(half))
	spread := stt - st*st/n
	if spread <= 0 {
		return Unknown()
	}
	slope := (stl - st*sl/n) / spread
	left := half[len(half)-1].log - math.Log10(p.Tolerance)
	if left <= 0 {
		return 0
	}
	if slope >= 0 {
		return Unknown()
	}
	return Number(-left / slope)
}
