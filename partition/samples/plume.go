package samples

import (
	"fmt"
	"math"

	"rowstead/partition/samples/fixed"
)

// The basin of the plume job: metres, seconds, grams.
const (
	basinLength  = 2400.0 // west to east
	basinWidth   = 1600.0 // south to north
	basinDepth   = 6.0
	through      = 80.0   // flow from west to east per metre of depth, m²/s
	eddyStrength = 28.0   // standard deviation of the eddies' stream function, m²/s
	dispersion   = 0.03   // m²/s
	decay        = 2.3e-6 // 1/s
	outfallSide  = 40.0   // each outfall spreads over a square of this side
	plumeSeed    = 2203
)

// outfall is a discharge into the basin.
type outfall struct {
	x, y float64 // its middle, m
	load float64 // g/s
}

// plume is steady transport in a shallow basin with eddies, finite volumes,
// upwind, one concentration a cell. Unknown i·ny + j; i counts eastwards.
type plume struct {
	nx, ny   int
	dx, dy   float64
	eddies   *field
	outfalls [2]outfall
}

func plumeJob() job {
	return job{
		info: Info{
			Name: "plume", Title: "waste water spreading in a harbour basin, carried rather than diffused",
			DefaultSize: 30000, MMatrix: true,
			Unknowns: []Unknown{{"c", "g/m³", -0.001, 5}},
		},
		build: newPlume,
	}
}

func newPlume(size int) generator {
	p := &plume{outfalls: [2]outfall{{500, 1100, 12}, {1300, 420, 5}}}
	p.nx, p.ny = grid(size, basinLength, basinWidth)
	p.dx, p.dy = basinLength/float64(p.nx), basinWidth/float64(p.ny)
	p.eddies = newField(basinLength, basinWidth, 150, fixed.NewStream(plumeSeed, 0))
	return p
}

func (p *plume) unknowns() int { return p.nx * p.ny }

// stream is the stream function (m²/s) at corner (i, j) of the grid: an even
// flow from west to east and eddies that fade towards the edges. Fluxes made
// from its differences are free of divergence whatever it is.
func (p *plume) stream(i, j int) float64 {
	a, b := float64(i)/float64(p.nx), float64(j)/float64(p.ny)
	fade := 16 * a * (1 - a) * b * (1 - b)
	eddy := eddyStrength * fade * p.eddies.value(float64(i)*p.dx, float64(j)*p.dy)
	return float64(through*b) + float64(eddy)
}

// fluxes are the flows (m³/s) out of cell (i, j) to the west, south, north and
// east.
func (p *plume) fluxes(i, j int) (west, south, north, east float64) {
	sw, se, nw, ne := p.stream(i, j), p.stream(i+1, j), p.stream(i, j+1), p.stream(i+1, j+1)
	flow := func(a, b float64) float64 { return float64(basinDepth * (a - b)) }
	return flow(sw, nw), flow(se, sw), flow(nw, ne), flow(ne, se)
}

func (p *plume) row(k int, out *line) {
	i, j := k/p.ny, k%p.ny
	west, south, north, east := p.fluxes(i, j)
	acrossX := basinDepth * dispersion * p.dy / p.dx
	acrossY := basinDepth * dispersion * p.dx / p.dy
	diagonal := float64(decay * p.dx * p.dy * basinDepth)
	// exchange with cell col over a face with flow f out of this cell
	exchange := func(col int, f, across float64) {
		out.add(col, min(f, 0)-across)
		diagonal += max(f, 0) + across
	}
	if i > 0 {
		exchange(k-p.ny, west, acrossX)
	} else {
		diagonal += max(west, 0) // the inflow is clean
	}
	if j > 0 {
		exchange(k-1, south, acrossY)
	}
	mid := len(out.cols)
	out.add(k, 0)
	if j < p.ny-1 {
		exchange(k+1, north, acrossY)
	}
	if i < p.nx-1 {
		exchange(k+p.ny, east, acrossX)
	} else {
		diagonal += max(east, 0)
	}
	out.vals[mid] = diagonal
	out.right = p.load(i, j)
}

// load is what the outfalls give cell (i, j), g/s: the share of their squares
// that lies in the cell.
func (p *plume) load(i, j int) float64 {
	x, y := float64(float64(i)*p.dx), float64(float64(j)*p.dy)
	sum := 0.0
	for _, o := range p.outfalls {
		w := overlap(x, x+p.dx, o.x-outfallSide/2, o.x+outfallSide/2)
		h := overlap(y, y+p.dy, o.y-outfallSide/2, o.y+outfallSide/2)
		sum += float64(o.load * w * h / (outfallSide * outfallSide))
	}
	return sum
}

// cellNumber is the largest flow across a cell over its dispersion, over a
// sample of cells: above 2 the flow rules.
func (p *plume) cellNumber() float64 {
	most := 0.0
	for i := 0; i < p.nx; i += max(1, p.nx/50) {
		for j := 0; j < p.ny; j += max(1, p.ny/50) {
			west, south, _, _ := p.fluxes(i, j)
			most = max(most, math.Abs(west)*p.dx/(p.dy*basinDepth*dispersion), math.Abs(south)*p.dy/(p.dx*basinDepth*dispersion))
		}
	}
	return most
}

func (p *plume) label(k int) string {
	return fmt.Sprintf("concentration at x = %.1f m, y = %.1f m", (float64(k/p.ny)+0.5)*p.dx, (float64(k%p.ny)+0.5)*p.dy)
}

func (p *plume) story() story {
	return story{
		sheet:    "Job 0431: Ostervale outer basin, two outfalls",
		question: "How much of the waste water of two outfalls reaches the bathing place at the east end of the outer basin in a long calm? Asked by the harbour board; analyst M. Ferrow.",
		model: fmt.Sprintf("Steady transport of a dissolved substance, averaged over 6 m of depth: div(v·c) - div(D·grad c) + lambda·c = q on 2400 m by 1600 m, D = 0.03 m²/s, lambda = 2.3e-6 1/s. Finite volumes, upwind, on %d by %d cells of %.3g m by %.3g m. "+
			"The flow is a measured one redrawn as a stream function: 480 m³/s from west to east and standing eddies of 150 m to 400 m. Cell numbers (speed times cell over D) reach %.0f.", p.nx, p.ny, p.dx, p.dy, p.cellNumber()),
		boundaries: "West: clean water comes in. East: open, water leaves with what it carries. North and south: quay walls. Outfalls of 12 g/s at (500, 1100) m and 5 g/s at (1300, 420) m, each over a square of 40 m.",
		rows:       "Row k is the mass balance of one cell: what leaves it minus what enters, and what decays, is what the outfalls give. A in m³/s, b in g/s, x in g/m³. A row sums to what decays plus what crosses the open edges; so does a column.",
		reading:    fmt.Sprintf("Entry k of x (counted from 0) is the concentration in cell i = k / %d eastwards, j = k mod %d northwards.", p.ny, p.ny),
		use:        "Compared with the limit of 0.5 g/m³ along the beach. Sum of lambda·c·volume and of the flux through the east edge must give 17 g/s.",
		watch:      "Nothing is symmetric here; closed eddies keep their water for hours and make iterative methods slow. Upwind differences smear the plume by about half a cell times the speed, which at coarse cells is far more than D.",
	}
}
