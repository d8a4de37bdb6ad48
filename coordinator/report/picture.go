package report

import (
	"fmt"
	"math"
	"strings"
)

// The picture is drawn in a box of these sizes, in SVG units.
const (
	pictureWidth, pictureHeight = 720, 400
	marginLeft, marginRight     = 64, 16
	marginTop, marginBottom     = 20, 44
)

// Picture returns a standalone SVG of the convergence: products to the right,
// residual upwards on a logarithmic axis; the estimate as a line, recomputed
// residuals as dots, the tolerance dashed. It is empty of curves when the
// record has fewer than two usable points.
func (r *Record) Picture() string {
	var b strings.Builder
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 %d %d" role="img" font-family="sans-serif" font-size="12">`+"\n",
		pictureWidth, pictureHeight)
	b.WriteString("<title>Residual against products</title>\n")
	fmt.Fprintf(&b, `<rect width="%d" height="%d" fill="#ffffff"/>`+"\n", pictureWidth, pictureHeight)
	a := r.axes()
	a.writeGrid(&b)
	r.writeTolerance(&b, a)
	r.writeCurves(&b, a)
	b.WriteString("</svg>\n")
	return b.String()
}

// axes maps products and decades to the box. low and high are whole decades.
type axes struct {
	last      float64 // products at the right edge
	low, high float64
}

func (r *Record) axes() axes {
	a := axes{last: 1, low: -1, high: 0}
	widen := func(v Number) {
		if v.Finite() && v > 0 {
			l := math.Log10(float64(v))
			a.low, a.high = min(a.low, math.Floor(l)), max(a.high, math.Ceil(l))
		}
	}
	widen(r.Tolerance)
	for _, p := range r.Curve {
		a.last = max(a.last, float64(p.Products))
		widen(p.True)
		widen(p.Estimate)
	}
	a.low, a.high = max(a.low, -30), min(a.high, 30)
	return a
}

func (a axes) x(products float64) float64 {
	return marginLeft + products/a.last*(pictureWidth-marginLeft-marginRight)
}

func (a axes) y(v Number) float64 {
	l := min(max(math.Log10(float64(v)), a.low), a.high)
	return marginTop + (a.high-l)/(a.high-a.low)*(pictureHeight-marginTop-marginBottom)
}

// writeGrid draws at most about ten decades and five counts with their labels.
func (a axes) writeGrid(b *strings.Builder) {
	every := math.Ceil((a.high - a.low) / 10)
	for d := a.high; d >= a.low; d -= every {
		y := a.y(Number(math.Pow(10, d)))
		fmt.Fprintf(b, `<path d="M%d %.1fH%d" stroke="#dddddd"/><text x="%d" y="%.1f" text-anchor="end">1e%.0f</text>`+"\n",
			marginLeft, y, pictureWidth-marginRight, marginLeft-6, y+4, d)
	}
	unit := roundStep(a.last / 5)
	for p := 0.0; p <= a.last; p += unit {
		fmt.Fprintf(b, `<text x="%.1f" y="%d" text-anchor="middle">%.0f</text>`+"\n", a.x(p), pictureHeight-marginBottom+18, p)
	}
	fmt.Fprintf(b, `<text x="%d" y="%d" text-anchor="middle">products</text>`+"\n", (marginLeft+pictureWidth-marginRight)/2, pictureHeight-8)
}

// roundStep is the smallest of 1, 2, 5 times a power of ten that is not below v.
func roundStep(v float64) float64 {
	if v <= 1 {
		return 1
	}
	ten := math.Pow(10, math.Floor(math.Log10(v)))
	for _, f := range []float64{1, 2, 5} {
		if f*ten >= v {
			return f * ten
		}
	}
	return 10 * ten
}

func (r *Record) writeTolerance(b *strings.Builder, a axes) {
	if !r.Tolerance.Finite() || r.Tolerance <= 0 {
		return
	}
	y := a.y(r.Tolerance)
	fmt.Fprintf(b, `<path d="M%d %.1fH%d" stroke="#aa3300" stroke-dasharray="6 4"/><text x="%d" y="%.1f" text-anchor="end" fill="#aa3300">tolerance</text>`+"\n",
		marginLeft, y, pictureWidth-marginRight, pictureWidth-marginRight, y-4)
}

// writeCurves draws the estimate as a line and every new recomputed residual as
// a dot.
func (r *Record) writeCurves(b *strings.Builder, a axes) {
	var path, dots strings.Builder
	before, pen := Unknown(), "M"
	lastProducts := -1
	for _, p := range r.Curve {
		if p.Products < lastProducts {
			pen = "M" // another right side begins
		}
		lastProducts = p.Products
		if p.Estimate.Finite() && p.Estimate > 0 {
			fmt.Fprintf(&path, "%s%.1f %.1f", pen, a.x(float64(p.Products)), a.y(p.Estimate))
			pen = "L"
		}
		if p.True.Finite() && p.True > 0 && p.True != before {
			fmt.Fprintf(&dots, `<circle cx="%.1f" cy="%.1f" r="3" fill="#224488"/>`+"\n", a.x(float64(p.Products)), a.y(p.True))
			before = p.True
		}
	}
	if path.Len() > 0 {
		fmt.Fprintf(b, `<path d="%s" fill="none" stroke="#6699cc" stroke-width="1.5"/>`+"\n", path.String())
	}
	b.WriteString(dots.String())
	fmt.Fprintf(b, `<text x="%d" y="%d"><tspan fill="#6699cc">line: estimated</tspan>  <tspan fill="#224488">dots: recomputed</tspan></text>`+"\n",
		marginLeft+8, marginTop-6)
}
