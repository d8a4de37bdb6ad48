package samples

import (
	"fmt"
	"slices"

	"rowstead/partition/samples/fixed"
)

// The town of the pipes job: metres of head, litres a second.
const (
	side     = 16    // a district has side×side junctions, the last one fewer
	works    = 64    // a works feeds so many districts
	tankMain = 400.0 // l/s per m, from the tank to the hub of its works
	tankHead = 78.0  // m above datum, ± 4 m from works to works
	leastUse = 0.004
	mostUse  = 0.04 // l/s a junction, on an evening
	townSeed = 4177
)

// pipes is a network of districts in rows of wide. Junction t = i·side + j of
// district d is unknown d·side² + t. Streets join neighbours within a district
// and over its border; junction 0 of a district is a hub with spokes to two or
// three dozen of its junctions and a trunk main to the hub of its works, itself
// the hub of every 64th district. Every link follows from its two ends, so that
// a row is made without the others.
type pipes struct {
	count, wide                        int
	use, link, bore, tank, spoke, tree fixed.Stream
}

func pipesJob() job {
	return job{
		info: Info{
			Name: "pipes", Title: "water mains of a town, hubs and dead ends, conductances over five decades",
			DefaultSize: 40000, Symmetric: true, Definite: true, MMatrix: true,
			Unknowns: []Unknown{{"h", "m above datum", 10, 83}},
		},
		build: newPipes,
	}
}

func newPipes(size int) generator {
	p := &pipes{count: size}
	districts := (size + side*side - 1) / (side * side)
	for p.wide = 1; p.wide*p.wide < districts; p.wide++ {
	}
	for i, s := range []*fixed.Stream{&p.use, &p.link, &p.bore, &p.tank, &p.spoke, &p.tree} {
		*s = fixed.NewStream(townSeed, uint64(i))
	}
	return p
}

func (p *pipes) unknowns() int { return p.count }

// pair numbers the link between junctions a and b, in either order.
func pair(a, b int) int { return int(fixed.Mix(uint64(min(a, b))<<32|uint64(max(a, b))) >> 1) }

// conductance of a link, linear at the working point, l/s per m of head.
func (p *pipes) conductance(a, b int) float64 {
	if a%(side*side) == 0 && b%(side*side) == 0 {
		return p.bore.PowerOfTen(pair(a, b), 1, 3) // trunk main
	}
	return p.bore.PowerOfTen(pair(a, b), -2, 3)
}

// street tells whether junctions t of district d and t − step are joined; step
// is 1 (j) or side (i). Every junction has one street to a lower one, drawn at
// random, and the other with probability 0.3: connected, with dead ends.
func (p *pipes) street(base, t, step int) bool {
	hasRow, hasColumn := t%side > 0, t >= side
	if step == 1 && !hasRow || step == side && !hasColumn {
		return false
	}
	if !hasRow || !hasColumn {
		return true
	}
	parent := 1
	if p.tree.Uniform(base+t) < 0.5 {
		parent = side
	}
	return parent == step || p.link.Uniform(pair(base+t, base+t-step)) < 0.3
}

// hasSpoke tells whether junction t > 0 of a district is joined to its hub,
// streets apart.
func (p *pipes) hasSpoke(base, t int) bool {
	return t != 1 && t != side && p.spoke.Uniform(base+t) < 0.1
}

// crosses tells whether a street joins a and b over the border of a district.
func (p *pipes) crosses(a, b int) bool {
	return a >= 0 && b < p.count && p.link.Uniform(pair(a, b)) < 0.3
}

// neighbours appends the junctions linked to k, in no order.
func (p *pipes) neighbours(k int, to []int32) []int32 {
	const whole = side * side
	d, t := k/whole, k%whole
	base, i, j := k-t, t/side, t%side
	join := func(exists bool, other int) {
		if exists && other < p.count {
			to = append(to, int32(other))
		}
	}
	join(p.street(base, t, 1), k-1)
	join(p.street(base, t, side), k-side)
	join(j < side-1 && p.street(base, t+1, 1), k+1)
	join(i < side-1 && p.street(base, t+side, side), k+side)
	east, west := k+whole-(side-1), k-whole+(side-1)
	join(j == side-1 && (d+1)%p.wide != 0 && p.crosses(k, east), east)
	join(j == 0 && d%p.wide != 0 && p.crosses(west, k), west)
	north, south := k+p.wide*whole-(side-1)*side, k-p.wide*whole+(side-1)*side
	join(i == side-1 && p.crosses(k, north), north)
	join(i == 0 && p.crosses(south, k), south)
	if t > 0 {
		join(p.hasSpoke(base, t), base)
		return to
	}
	for s := 1; s < whole; s++ {
		join(p.hasSpoke(base, s), base+s)
	}
	join(d%works != 0, d/works*works*whole)
	for e := d + 1; d%works == 0 && e < d+works; e++ {
		join(true, e*whole)
	}
	return to
}

func (p *pipes) row(k int, out *line) {
	out.cols = append(p.neighbours(k, out.cols), int32(k))
	slices.Sort(out.cols)
	diagonal, mid := 0.0, 0
	out.right = -p.use.Between(k, leastUse, mostUse)
	if k%(works*side*side) == 0 {
		diagonal += tankMain
		out.right += float64(tankMain * p.tank.Between(k, tankHead-4, tankHead+4))
	}
	for at, c := range out.cols {
		if int(c) == k {
			mid = at
			out.vals = append(out.vals, 0)
			continue
		}
		g := p.conductance(k, int(c))
		out.vals = append(out.vals, -g)
		diagonal += g
	}
	out.vals[mid] = diagonal
}

func (p *pipes) label(k int) string {
	d, t := k/(side*side), k%(side*side)
	switch {
	case k%(works*side*side) == 0:
		return fmt.Sprintf("head at the works in district %d", d)
	case t == 0:
		return fmt.Sprintf("head at the hub of district %d", d)
	}
	return fmt.Sprintf("head at junction %d of district %d", t, d)
}

func (p *pipes) story() story {
	districts := (p.count + side*side - 1) / (side * side)
	return story{
		sheet:    "Job 0444: Ostervale mains, evening pressures",
		question: "What pressure is left at every junction of the town's mains on an evening, when the tanks stand at different heights and water drifts from one works to the other? Asked by the town works; analyst T. Okunrin.",
		model: fmt.Sprintf("Network of %d junctions in %d districts, one works with a tank for every 64 districts. Each link carries flow = g · (difference of heads), linear at the working point; g from 0.01 to 1000 l/s per m, five decades, from house connections to mains. "+
			"Half of the streets are dead ends. The hub of a district has two or three dozen spokes, the hub of a works a trunk main to each district besides.", p.count, districts),
		boundaries: "Tanks at 74 m to 82 m, each joined to its works by 400 l/s per m. Each junction draws 0.004 l/s to 0.04 l/s on an evening.",
		rows:       "Row k is the water balance of junction k: what leaves through its links minus what comes from a tank is minus what is drawn. A in l/s per m, b in l/s, x in m.",
		reading:    "Entry k of x (counted from 0) is the head at junction k mod 256 of district k / 256; junction 0 is the hub.",
		use:        "Head minus ground height is the pressure; below 20 m the junction goes on the list for larger pipes. The linear model holds near the working point only; take the flows, correct g, solve again.",
		watch:      "Rows have from two to more than a hundred entries, and blocks of rows need many entries of their neighbours: the trunk mains reach everywhere. Heads behind a long chain of narrow pipes are much less certain than the residual suggests.",
	}
}
