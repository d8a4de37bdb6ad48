package samples

import (
	"fmt"

	"rowstead/partition/samples/fixed"
)

// settle writes the sums of a node's own block over the six places from mid on
// and closes the gaps where they are zero: two equal members on both sides cancel.
func (l *line) settle(mid int, own [6]float64) {
	copy(l.vals[mid:], own[:])
	kept := mid
	for k := mid; k < len(l.cols); k++ {
		if l.vals[k] != 0 {
			l.cols[kept], l.vals[kept] = l.cols[k], l.vals[k]
			kept++
		}
	}
	l.cols, l.vals = l.cols[:kept], l.vals[:kept]
}

// load is the force (N) on freedom r of a node: pallets on five nodes of six,
// between a half and the whole level load, and a share of it sideways.
func (f *frame) load(node int, at [3]int, r int) float64 {
	s := fixed.NewStream(rackSeed, 0)
	weight := 0.0
	if (at[2]+1)%perBeam == 0 && s.Uniform(2*node) < 5.0/6 {
		weight = s.Between(2*node+1, 0.5, 1) * levelLoad
	}
	switch r {
	case 0:
		return leaning * weight
	case 1:
		return leaning * weight
	case 2:
		return -weight
	case 4: // the pallets press on the inner edge of the beam
		return weight * 0.02
	}
	return 0
}

// place is a node's position in metres.
func (f *frame) place(at [3]int) [3]float64 {
	pairs := at[0] / 2
	x := float64(float64(pairs) * (frameDepth + aisle))
	if at[0]%2 == 1 {
		x += frameDepth
	}
	return [3]float64{x, float64(at[1]) * bayLength, float64(at[2]+1) * rise}
}

func (f *frame) label(k int) string {
	node := k / 6
	at := [3]int{node / (f.n[1] * f.n[2]), node / f.n[2] % f.n[1], node % f.n[2]}
	p := f.place(at)
	words := [6]string{"displacement u", "displacement v", "displacement w", "rotation p", "rotation q", "rotation r"}
	return fmt.Sprintf("%s of the node at (%.1f, %.1f, %.1f) m", words[k%6], p[0], p[1], p[2])
}

func (f *frame) story() story {
	return story{
		sheet:    "Job 0402: Hallow Road store, pallet rack as built",
		question: "How far does the pallet rack of the Hallow Road store lean under its pallets and their sideways share, and which nodes turn most? Asked by the store's owner; analyst M. Ferrow, checked by I. Brandal.",
		model: fmt.Sprintf("Linear elastic space frame, first order, Bernoulli beams with torsion: %d frames across, %d bays along, %d levels of beams 1.6 m apart. Bays 2.7 m, frames 1.1 m deep, aisles 1.9 m, tied across at the top level only; uprights have a node every 0.4 m, a brace every 0.8 m. "+
			"Steel, E = 210 GPa, G = 81 GPa; open uprights with next to no torsion stiffness, box beams, light bracing; uprights lighter above half height. Joints rigid.", f.n[0], f.n[1]-1, f.n[2]/perBeam),
		boundaries: "Uprights clamped to the floor. Pallets of 4.5 kN to 9 kN on five beam ends of six, pressing on the inner edge of the beams (2 cm), and half a per cent of it sideways in x and y for the lean of the uprights.",
		rows:       "Row k is the equilibrium of one node in one direction: rows 0-2 of a node are forces in N, rows 3-5 moments in N·m. Displacements in m, rotations in rad; so A mixes N/m, N and N·m.",
		reading:    fmt.Sprintf("Entry k of x (counted from 0) is unknown k mod 6 (u, v, w, then the rotations p, q, r about x, y, z) of node k / 6; node (i·%d + j)·%d + l is frame line i across, upright j along, upright node l from the bottom, 0.4 m apart.", f.n[1], f.n[2]),
		use:        "Largest lean against height / 200, and the end forces of the members from the same answer. First order only: where the lean is large, second order decides.",
		watch:      "Six unknowns a node belong together and a cut must not part them. Bending makes the matrix badly conditioned (stiff along the members, soft across): count the digits before quoting a rotation, and scale before judging a residual that adds N to N·m.",
		codes:      "Racks are designed to the code in force where they stand, with its joint tests, load factors, second-order and seismic checks, under the seal of a licensed engineer; nothing of that is in this model.",
	}
}
