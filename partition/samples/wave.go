package samples

import "fmt"

// The hall of the wave job.
const (
	hallLength = 40.0    // m, west to east
	hallWidth  = 30.0    // m
	soundSpeed = 340.0   // m/s
	perWave    = 32      // cells a wavelength
	phase      = 0.03855 // (k·h)² = (2π/32)²
	damping    = 0.03    // loss of the air and the fittings, share of k²
	spongeLoss = 0.6     // loss at the back of the absorbing wall, share of k²
	spongeDeep = 20      // its depth, cells
	machine    = 4.0     // Pa, strength of the source times h²
)

// wave is sound of one frequency in a plan of a hall, −Δp − k²(1 + i·s)·p = f
// on a grid of square cells. p = a + i·c stands as two real unknowns a node:
// 2·(i·ny + j) is a, the next one c; i counts eastwards. Rows are times h².
type wave struct{ nx, ny int }

func waveJob() job {
	return job{
		info: Info{
			Name: "wave", Title: "sound of one frequency in a hall, indefinite, real and imaginary parts",
			DefaultSize: 20000,
			Unknowns:    []Unknown{{"a", "Pa", -40, 40}, {"c", "Pa", -40, 40}},
		},
		build: newWave,
	}
}

func newWave(size int) generator {
	nx, ny := grid(size/2, hallLength, hallWidth)
	return &wave{nx, ny}
}

func (w *wave) unknowns() int { return 2 * w.nx * w.ny }

// wall tells whether the partition wall parts cell (i, j) from (i+1, j): at two
// thirds of the hall, with a door in its southern half.
func (w *wave) wall(i, j int) bool {
	return i+1 == 2*w.nx/3 && (j < w.ny/6 || j >= w.ny/3)
}

// loss is s at column i: it rises quadratically into the absorbing east wall.
func (w *wave) loss(i int) float64 {
	depth := i - (w.nx - 1 - spongeDeep)
	if depth <= 0 {
		return damping
	}
	t := float64(depth) / spongeDeep
	return damping + float64(spongeLoss*t*t)
}

func (w *wave) row(k int, out *line) {
	node, part := k/2, k%2
	i, j := node/w.ny, node%w.ny
	links := 0.0
	join := func(exists bool, other int) {
		if exists {
			out.add(2*other+part, -1)
			links++
		}
	}
	join(i > 0 && !w.wall(i-1, j), node-w.ny)
	join(j > 0, node-1)
	mid := len(out.cols)
	out.add(2*node, 0)
	out.add(2*node+1, 0)
	join(j < w.ny-1, node+1)
	join(i < w.nx-1 && !w.wall(i, j), node+w.ny)
	loss := phase * w.loss(i)
	if part == 1 {
		loss = -loss
	}
	// Re: (L − k²h²)·a + s·k²h²·c = f;  Im: (L − k²h²)·c − s·k²h²·a = 0
	out.vals[mid+part], out.vals[mid+1-part] = links-phase, loss
	if part == 0 && i == w.nx/5 && j == w.ny/2 {
		out.right = machine
	}
}

func (w *wave) label(k int) string {
	h := hallLength / float64(w.nx)
	part := [2]string{"real", "imaginary"}[k%2]
	return fmt.Sprintf("sound pressure, %s part, at x = %.2f m, y = %.2f m", part, (float64(k/2/w.ny)+0.5)*h, (float64(k/2%w.ny)+0.5)*h)
}

func (w *wave) story() story {
	h := hallLength / float64(w.nx)
	return story{
		sheet:    "Job 0459: Hallow Road press shop, one tone of the stamping line",
		question: fmt.Sprintf("How loud is the %.0f Hz tone of the stamping line behind the partition wall with its open door, now that the east wall is lined? Asked by the press shop; analyst I. Brandal.", soundSpeed/(perWave*h)),
		model: fmt.Sprintf("Sound of one frequency in plan, -div grad p - k²(1 + i·s)·p = f, on %d by %d square cells of %.3g m, 32 to a wavelength, five-point differences, speed of sound 340 m/s. The frequency follows from the size of the job. "+
			"Loss s = 0.03 in the hall. A partition wall at two thirds of the length, with a door in its southern half.", w.nx, w.ny, h),
		boundaries: "Walls: hard (no normal velocity). East: an absorbing wall 20 cells deep, s rising quadratically to 0.6. Source: the stamping line, one cell at a fifth of the length, strength 4 Pa over h².",
		rows:       "The complex equation as two real ones a node, real part first, both times h²: A without unit, b in Pa, x in Pa. Four entries to neighbours, and two within the node.",
		reading:    fmt.Sprintf("Entry k of x (counted from 0) is the real part of the pressure for even k, the imaginary part for odd k, at node k / 2 = i·%d + j, i eastwards, j northwards; the amplitude is the root of the sum of their squares, the level 20·log10(amplitude / 28.3 µPa) dB.", w.ny),
		use:        "Level map for the work places behind the wall. A tone in plan overstates echoes between floor and roof; the measured level at three places decides.",
		watch:      "The system is indefinite: several waves fit the hall each way, and iterative methods find it hard: without a preconditioner, or with a small incomplete factor, they may stand still. Larger jobs have more waves and are harder out of proportion. Near a resonance of the hall the answer is sensitive to the loss, which is a guess. 32 cells a wavelength leave a small phase error, which grows with the number of wavelengths.",
	}
}
