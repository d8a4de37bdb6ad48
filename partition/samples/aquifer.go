package samples

import (
	"fmt"

	"rowstead/partition/samples/fixed"
)

// The valley of the aquifer job: lengths in metres, time in days.
const (
	valleyLength = 6000.0 // west to east
	valleyWidth  = 4000.0 // south to north
	lakeHead     = 42.0   // west edge
	plainHead    = 35.0   // east edge
	riverWidth   = 30.0
	riverLeak    = 0.5    // conductance of the river bed, 1/d
	recharge     = 0.0003 // rain to sink in, m/d
	tightGround  = 0.2    // m/d: ground of this conductivity takes up half of it
	wellRate     = 1500.0 // m³/d, each
	squeeze      = 0.1    // vertical over horizontal conductivity
	decadesK     = 5.0    // of conductivity, over ±2 standard deviations
	aquiferSeed  = 1701
)

// stratum is one layer, from the ground downwards.
type stratum struct {
	name      string
	thickness float64 // m
	median    float64 // of the conductivity, m/d
}

// aquifer is steady groundwater flow in three layers, finite volumes, one head
// a cell. Unknown (i·ny + j)·3 + layer; i counts eastwards, j northwards.
type aquifer struct {
	nx, ny int
	dx, dy float64
	layers [3]stratum
	fields [3]*field
	wells  [4][2]float64
}

func aquiferJob() job {
	return job{
		info: Info{
			Name: "aquifer", Title: "groundwater heads in a valley, conductivities over five decades",
			DefaultSize: 36000, Symmetric: true, Definite: true, MMatrix: true,
			Unknowns: []Unknown{{"h", "m above datum", 10, 50}},
		},
		build: newAquifer,
	}
}

func newAquifer(size int) generator {
	a := &aquifer{layers: [3]stratum{{"sand", 12, 15}, {"silt", 6, 3}, {"gravel", 20, 30}}}
	a.nx, a.ny = grid(size/3, valleyLength, valleyWidth)
	a.dx, a.dy = valleyLength/float64(a.nx), valleyWidth/float64(a.ny)
	for l := range a.fields {
		a.fields[l] = newField(valleyLength, valleyWidth, 120, fixed.NewStream(aquiferSeed, uint64(l)))
	}
	for w, plan := range [4][2]float64{{1500, 1100}, {2300, 3100}, {4700, 900}, {5100, 2700}} {
		a.wells[w] = a.bestPlace(plan)
	}
	return a
}

// grid cuts a rectangle into about count cells that are nearly square.
func grid(count int, width, height float64) (nx, ny int) {
	nx = 1
	for float64((nx+1)*(nx+1))*height <= float64(count)*width {
		nx++
	}
	return nx, nearest(float64(count) / float64(nx))
}

// bestPlace is the place near the planned one where the gravel conducts best,
// as the trial borings would find it.
func (a *aquifer) bestPlace(plan [2]float64) [2]float64 {
	best, most := plan, -1e9
	for i := -10; i <= 10; i++ {
		for j := -10; j <= 10; j++ {
			p := [2]float64{plan[0] + 20*float64(i), plan[1] + 20*float64(j)}
			if g := a.fields[2].value(p[0], p[1]); g > most {
				best, most = p, g
			}
		}
	}
	return best
}

func (a *aquifer) unknowns() int { return 3 * a.nx * a.ny }

// conductivity is K at the middle of a cell, m/d: the layer's median times
// 10^(g·5/4) with g standard normal.
func (a *aquifer) conductivity(i, j, l int) float64 {
	g := a.fields[l].value((float64(i)+0.5)*a.dx, (float64(j)+0.5)*a.dy)
	return a.layers[l].median * fixed.Exp10(g*(decadesK/4))
}

func (a *aquifer) row(k int, out *line) {
	l, j, i := k%3, k/3%a.ny, k/(3*a.ny)
	own, b := a.conductivity(i, j, l), a.layers[l].thickness
	east, north := b*a.dy/a.dx, b*a.dx/a.dy
	diagonal := 0.0
	couple := func(col int, c float64) {
		out.add(col, -c)
		diagonal += float64(c)
	}
	if i > 0 {
		couple(k-3*a.ny, meanOf(own, a.conductivity(i-1, j, l))*east)
	}
	if j > 0 {
		couple(k-3, meanOf(own, a.conductivity(i, j-1, l))*north)
	}
	if l > 0 {
		couple(k-1, a.vertical(a.conductivity(i, j, l-1), own, l-1))
	}
	mid := len(out.cols)
	out.add(k, 0)
	if l < 2 {
		couple(k+1, a.vertical(own, a.conductivity(i, j, l+1), l))
	}
	if j < a.ny-1 {
		couple(k+3, meanOf(own, a.conductivity(i, j+1, l))*north)
	}
	if i < a.nx-1 {
		couple(k+3*a.ny, meanOf(own, a.conductivity(i+1, j, l))*east)
	}
	toOutside, inflow := a.outside(i, j, l, own)
	out.vals[mid], out.right = diagonal+toOutside, inflow
}

// meanOf is the harmonic mean.
func meanOf(a, b float64) float64 { return 2 / (1/a + 1/b) }

// vertical is the conductance between layer l and the one below, m²/d.
func (a *aquifer) vertical(upper, lower float64, l int) float64 {
	resistance := a.layers[l].thickness/(2*squeeze*upper) + a.layers[l+1].thickness/(2*squeeze*lower)
	return a.dx * a.dy / resistance
}

// outside returns the conductance (m²/d) of cell (i, j, l) to fixed heads and
// the water it is given (m³/d), those heads included. own is K of the cell.
func (a *aquifer) outside(i, j, l int, own float64) (conductance, inflow float64) {
	cell := own * a.layers[l].thickness * a.dy / a.dx
	if i == 0 {
		conductance += 2 * cell
		inflow += float64(2 * cell * lakeHead)
	}
	if i == a.nx-1 {
		conductance += 2 * cell
		inflow += float64(2 * cell * plainHead)
	}
	x, y := float64(float64(i)*a.dx), float64(float64(j)*a.dy)
	if l == 0 {
		middle, stage := river(y + a.dy/2)
		wet := float64(overlap(x, x+a.dx, middle-riverWidth/2, middle+riverWidth/2) * a.dy * riverLeak)
		conductance += wet
		inflow += float64(wet*stage) + float64(recharge*a.dx*a.dy*own/(own+tightGround))
	}
	for _, w := range a.wells {
		if l == 2 && w[0] >= x && w[0] < x+a.dx && w[1] >= y && w[1] < y+a.dy {
			inflow -= wellRate
		}
	}
	return conductance, inflow
}

// river is the middle line x of the Asp at height y, and its stage: it falls one
// metre from north to south.
func river(y float64) (x, stage float64) {
	return 3600 + float64(350*fixed.SinPi(y/1300)), 37 + float64(y/valleyWidth)
}

func (a *aquifer) label(k int) string {
	l, j, i := k%3, k/3%a.ny, k/(3*a.ny)
	return fmt.Sprintf("head in the %s at x = %.0f m, y = %.0f m", a.layers[l].name, (float64(i)+0.5)*a.dx, (float64(j)+0.5)*a.dy)
}

func (a *aquifer) story() story {
	return story{
		sheet:    "Job 0417: Veldmoor waterworks, four new wells beside the Asp",
		question: "How far do four wells of 1500 m³/d each draw the groundwater down in the Veldmoor valley, and how much of their water comes out of the river Asp? Asked by the waterworks; analyst I. Brandal.",
		model: fmt.Sprintf("Steady saturated flow, -div(K·grad h) = q, in three layers under a plan of 6000 m by 4000 m: 12 m of sand, 6 m of silt, 20 m of gravel. Finite volumes on %d by %d cells of %.3g m by %.3g m in each layer, harmonic means between cells. "+
			"K is log-normal in each layer, medians 15, 3 and 30 m/d, five decades over plus and minus two standard deviations, correlated over about 200 m; across the layers a tenth of it.", a.nx, a.ny, a.dx, a.dy),
		boundaries: "West edge: the lake, head 42 m. East edge: the plain, head 35 m. North and south: no flow. The Asp (30 m wide, stage 38 m in the north to 37 m in the south) lies on the sand over a bed of 0.5 1/d. Recharge 0.3 mm/d · K/(K + 0.2 m/d) on the sand: tight ground sheds its rain. Four wells in the gravel, each where the gravel near the planned place conducts best.",
		rows:       "Row k is the water balance of one cell: what leaves to its neighbours and to fixed heads, minus what is given, is zero. Entries of A in m²/d, b in m³/d, x in m.",
		reading:    fmt.Sprintf("Entry k of x (counted from 0) is the head in cell i = k / %d eastwards, j = (k / 3) mod %d northwards, layer k mod 3 (0 sand, 1 silt, 2 gravel). Subtract the answer with b of the wells set to zero for the drawdown.", 3*a.ny, a.ny),
		use:        "The drawdown map goes to the water authority; the exchange with the river, 0.5 1/d times the wetted area times (stage - h), to the fisheries report.",
		watch:      "The largest entries of the rows differ by ten decades, and the rows in tight ground are tiny beside those in the gravel: a small residual in m³/d says little about the heads there. The measured conductivities are a guess between borings, not a fact.",
	}
}
