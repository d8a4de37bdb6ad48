package samples

// The pallet rack of the frame job: newtons, metres, radians.
const (
	young      = 2.1e11 // N/m²
	shear      = 8.1e10 // N/m²
	bayLength  = 2.7    // along the aisle, y
	frameDepth = 1.1    // across a frame, x
	aisle      = 1.9    // between frames, x
	rise       = 0.4    // between nodes of an upright, z
	perBeam    = 4      // such steps from one level of beams to the next
	perBrace   = 2      // and from one brace of a frame to the next
	levelLoad  = 9000.0 // N a node, downwards
	leaning    = 0.005  // sideways load over vertical load
	rackSeed   = 3310
)

// section is the cross-section of a member: area, second moments about its two
// other axes in cyclic order, torsion constant; m² and m⁴. For a member along x
// those axes are y and z, along y z and x, along z x and y.
type section struct{ area, first, second, torsion float64 }

// frame is a space frame of straight members along the axes, six unknowns a
// node: u, v, w in m and rotations p, q, r about x, y, z in rad. Node
// (i·ny + j)·nz + l, i across the aisles, j along them, l upwards; the floor
// below l = 0 is fixed.
type frame struct{ n [3]int }

func frameJob() job {
	return job{
		info: Info{
			Name: "frame", Title: "steel pallet rack as a space frame, six unknowns a node",
			DefaultSize: 24000, Symmetric: true, Definite: true,
			Unknowns: []Unknown{
				{"u", "m", -0.1, 1}, {"v", "m", -0.1, 1}, {"w", "m", -0.1, 0.01},
				{"p", "rad", -0.2, 0.2}, {"q", "rad", -0.2, 0.2}, {"r", "rad", -0.2, 0.2},
			},
		},
		build: newFrame,
	}
}

func newFrame(size int) generator {
	nodes := size / 6
	nz := perBeam * min(max(2, cube(nodes)/2), 12)
	nx := 2
	for 2*(nx+2)*(nx+2)*nz <= nodes {
		nx += 2
	}
	return &frame{[3]int{nx, nearest(float64(nodes) / float64(nx*nz)), nz}}
}

func (f *frame) unknowns() int { return 6 * f.n[0] * f.n[1] * f.n[2] }

// member is the beam from node at (its lower end) along axis.
type member struct {
	axis   int
	length float64
	section
}

// member returns the beam that begins at node at and runs along axis; at[2] may
// be −1, the floor. Across the aisles only the top level is tied.
func (f *frame) member(at [3]int, axis int) (m member, exists bool) {
	end := at
	end[axis]++
	if at[axis] < 0 && axis < 2 || end[axis] >= f.n[axis] {
		return m, false
	}
	switch axis {
	case 0:
		if at[0]%2 == 1 {
			return member{0, aisle, section{3.2e-4, 9e-8, 1.4e-7, 1.1e-7}}, at[2] == f.n[2]-1
		}
		return member{0, frameDepth, section{2.4e-4, 4e-8, 6e-8, 4e-10}}, (at[2]+1)%perBrace == 0
	case 1:
		return member{1, bayLength, section{6.5e-4, 3.5e-7, 1.2e-6, 5e-9}}, (at[2]+1)%perBeam == 0
	}
	upright := section{9.2e-4, 9e-7, 6.5e-7, 1.4e-9}
	if 2*end[2] >= f.n[2] { // lighter above half height
		upright = section{6.1e-4, 5.4e-7, 3.8e-7, 6e-10}
	}
	return member{2, rise, upright}, true
}

// stiffness is the entry of the member's 12×12 matrix in row (end a, freedom r)
// and column (end b, freedom c): ends 0 and 1, freedoms 0-2 displacements along
// and 3-5 rotations about x, y, z. Bernoulli beam; Przemieniecki, Theory of
// Matrix Structural Analysis, chapter 5, without shear.
func (m member) stiffness(a, r, b, c int) float64 {
	if r < 3 && c >= 3 {
		return m.stiffness(b, c, a, r) // symmetric
	}
	turnR, turnC := r >= 3, c >= 3
	p, q := (r%3-m.axis+3)%3, (c%3-m.axis+3)%3 // 0: along the member
	sign := 1.0
	if a != b {
		sign = -1
	}
	bending := [3]float64{0, young * m.first, young * m.second} // about local axes 1 and 2
	l := m.length
	switch {
	case turnR == turnC && p != q:
		return 0
	case !turnR && p == 0:
		return sign * young * m.area / l
	case !turnR: // displacement p bends about the other axis
		return sign * 12 * bending[3-p] / (l * l * l)
	case turnC && p == 0:
		return sign * shear * m.torsion / l
	case turnC && a == b:
		return 4 * bending[p] / l
	case turnC:
		return 2 * bending[p] / l
	case p == 0 || q == 0 || p == q:
		return 0
	}
	if (b == 1) != (p == 1) { // rotation p against displacement q at end b
		sign = -1
	} else {
		sign = 1
	}
	return sign * 6 * bending[p] / (l * l)
}

func (f *frame) row(k int, out *line) {
	node, r := k/6, k%6
	ny, nz := f.n[1], f.n[2]
	at := [3]int{node / (ny * nz), node / nz % ny, node % nz}
	stride := [3]int{ny * nz, nz, 1}
	var own [6]float64
	couple := func(m member, end, other int) {
		for c := range 6 {
			own[c] += m.stiffness(end, r, end, c)
			if v := m.stiffness(end, r, 1-end, c); other >= 0 && v != 0 {
				out.add(6*other+c, v)
			}
		}
	}
	for d := range 3 {
		below := at
		below[d]--
		if m, ok := f.member(below, d); ok {
			other := node - stride[d]
			if below[d] < 0 {
				other = -1 // the floor
			}
			couple(m, 1, other)
		}
	}
	mid := len(out.cols)
	for c := range 6 {
		out.add(6*node+c, 0)
	}
	for d := 2; d >= 0; d-- {
		if m, ok := f.member(at, d); ok {
			couple(m, 0, node+stride[d])
		}
	}
	out.settle(mid, own)
	out.right = f.load(node, at, r)
}
