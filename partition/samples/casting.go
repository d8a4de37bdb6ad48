package samples

import "fmt"

// The mould of the casting job: metres, watts, degrees Celsius.
const (
	steel        = 32.0     // W/(m·K)
	sand         = 0.7      // W/(m·K)
	heating      = 100000.0 // W/m³ in the casting
	contact      = 800.0    // W/(m²·K) between casting and sand
	filmTop      = 25.0     // W/(m²·K)
	filmSide     = 15.0     // W/(m²·K)
	airDegrees   = 20.0
	waterDegrees = 60.0
)

// box is a body with its faces along the axes.
type box struct{ low, high [3]float64 }

func (b box) holds(p [3]float64) bool {
	for d := range 3 {
		if p[d] < b.low[d] || p[d] >= b.high[d] {
			return false
		}
	}
	return true
}

// casting is steady conduction in a steel casting in its sand mould, finite
// volumes on a grid that is fine towards the outside, one temperature a cell.
// Unknown (i·ny + j)·nz + l. Cells of the cooling channel keep an equation of
// their own, temperature = 60 °C.
type casting struct {
	n       [3]int
	edges   [3][]float64 // of the cells, along each axis, m
	steel   box
	channel box
}

func castingJob() job {
	return job{
		info: Info{
			Name: "casting", Title: "heated steel casting in a sand mould, films, contact and a cooling channel",
			DefaultSize: 30000, Symmetric: true, Definite: true, MMatrix: true,
			Unknowns: []Unknown{{"T", "°C", 15, 1200}},
		},
		build: newCasting,
	}
}

func newCasting(size int) generator {
	c := &casting{
		steel:   box{[3]float64{0.15, 0, 0.08}, [3]float64{0.45, 0.22, 0.2}},
		channel: box{[3]float64{0, 0.28, 0.1}, [3]float64{0.6, 0.33, 0.15}},
	}
	nz := max(4, cube(size*3/8))
	ny := (4*nz + 1) / 3
	c.n = [3]int{nearest(float64(size) / float64(ny*nz)), ny, nz}
	for d, length := range [3]float64{0.6, 0.4, 0.3} {
		c.edges[d] = graded(c.n[d], length)
	}
	return c
}

// graded cuts [0, length] into n cells, finer towards both ends: the edges lie
// at t²·(3 − 2t)·0.9 + 0.1·t.
func graded(n int, length float64) []float64 {
	e := make([]float64, n+1)
	for i := range e {
		t := float64(i) / float64(n)
		e[i] = length * (float64(0.9*t*t*(3-2*t)) + float64(0.1*t))
	}
	return e
}

func (c *casting) unknowns() int { return c.n[0] * c.n[1] * c.n[2] }

// cell is what the balance of one cell needs to know of itself or a neighbour.
type cell struct {
	at      [3]int
	half    [3]float64 // half its widths, m
	inSteel bool
	water   bool
}

func (c *casting) cell(at [3]int) cell {
	var middle [3]float64
	out := cell{at: at}
	for d := range 3 {
		low, high := c.edges[d][at[d]], c.edges[d][at[d]+1]
		middle[d], out.half[d] = (low+high)/2, (high-low)/2
	}
	out.inSteel, out.water = c.steel.holds(middle), c.channel.holds(middle)
	return out
}

func (c cell) conductivity() float64 {
	if c.inSteel {
		return steel
	}
	return sand
}

// face is the area of the cell's faces across axis d, m².
func (c cell) face(d int) float64 { return 4 * c.half[(d+1)%3] * c.half[(d+2)%3] }

// volume is the cell's, m³.
func (c cell) volume() float64 { return 8 * c.half[0] * c.half[1] * c.half[2] }

// link is the conductance between two neighbours along axis d, the lower one
// first, W/K: two half cells and, between steel and sand, the contact in series.
func link(lower, upper cell, d int) float64 {
	resistance := lower.half[d]/lower.conductivity() + upper.half[d]/upper.conductivity()
	if lower.inSteel != upper.inSteel {
		resistance += 1 / contact
	}
	return lower.face(d) / resistance
}

func (c *casting) row(k int, out *line) {
	nz, ny := c.n[2], c.n[1]
	stride := [3]int{ny * nz, nz, 1}
	own := c.cell([3]int{k / (ny * nz), k / nz % ny, k % nz})
	if own.water {
		out.add(k, 1)
		out.right = waterDegrees
		return
	}
	diagonal := 0.0
	exchange := func(d, step int) {
		at := own.at
		at[d] += step
		if at[d] < 0 || at[d] == c.n[d] {
			g, degrees := c.film(own, d, step)
			diagonal += g
			out.right += float64(g * degrees)
			return
		}
		other := c.cell(at)
		lower, upper := own, other
		if step < 0 {
			lower, upper = other, own
		}
		g := link(lower, upper, d)
		diagonal += g
		if other.water {
			out.right += float64(g * waterDegrees)
		} else {
			out.add(k+step*stride[d], -g)
		}
	}
	for d := range 3 {
		exchange(d, -1)
	}
	mid := len(out.cols)
	out.add(k, 0)
	for d := 2; d >= 0; d-- {
		exchange(d, 1)
	}
	out.vals[mid] = diagonal
	if own.inSteel {
		out.right += float64(heating * own.volume())
	}
}

// film is the conductance (W/K) from an outer cell to the air beyond its face:
// none through the symmetry plane y = 0 and the plinth z = 0.
func (c *casting) film(own cell, d, step int) (conductance, degrees float64) {
	h := filmSide
	switch {
	case step < 0 && d > 0:
		return 0, airDegrees
	case d == 2:
		h = filmTop
	}
	return own.face(d) / (own.half[d]/own.conductivity() + 1/h), airDegrees
}

func (c *casting) label(k int) string {
	at := c.cell([3]int{k / (c.n[1] * c.n[2]), k / c.n[2] % c.n[1], k % c.n[2]})
	body := "sand"
	switch {
	case at.water:
		body = "water"
	case at.inSteel:
		body = "steel"
	}
	var p [3]float64
	for d := range 3 {
		p[d] = 1000 * (c.edges[d][at.at[d]] + at.half[d])
	}
	return fmt.Sprintf("temperature of the %s at (%.1f, %.1f, %.1f) mm", body, p[0], p[1], p[2])
}

func (c *casting) story() story {
	return story{
		sheet:    "Job 0388: Hallow foundry, valve body kept hot in its mould",
		question: "How hot does a valve body of steel become in its sand mould while it is held under electric heating, and does the cooling channel keep the mould's flank below 300 °C? Asked by the foundry; analyst T. Okunrin.",
		model: fmt.Sprintf("Steady conduction, -div(k·grad T) = q, in half a mould of 600 mm by 400 mm by 300 mm. Finite volumes on %d by %d by %d cells, fine towards the outside (a factor of ten and more in width). "+
			"Steel 32 W/(m·K) in 150-450, 0-220, 80-200 mm, heated with 100 kW/m³; sand 0.7 W/(m·K) around it; contact 800 W/(m²·K) between the two.", c.n[0], c.n[1], c.n[2]),
		boundaries: "Top: film of 25 W/(m²·K) to air at 20 °C. Ends and flank: film of 15 W/(m²·K). Plane y = 0 (symmetry) and plinth z = 0: insulated. Cooling channel 280-330 by 100-150 mm along the whole length: 60 °C.",
		rows:       "Row k is the heat balance of one cell: A in W/K, b in W, x in °C. Rows of the cooling channel are of another kind, 1·T = 60 °C, with their columns moved to the right side so that A stays symmetric: their unit is a temperature, not a power.",
		reading:    fmt.Sprintf("Entry k of x (counted from 0) is the temperature of cell i = k / %d along the mould, j = (k / %d) mod %d across, l = k mod %d upwards.", c.n[1]*c.n[2], c.n[2], c.n[1], c.n[2]),
		use:        "Highest temperature of the steel for the holding time, highest temperature of the flank for the guard rail; sum of b over heated cells minus heat through the films is what the cooling water takes.",
		watch:      "The rows are of very different scale: thin cells of steel reach several W/K, cells of sand a thousandth of that, channel rows are 1. A residual in mixed units is ruled by the largest rows; look at the scaled one. Radiation is left out.",
	}
}
