// Package kernel holds the loops that touch vectors of the length of the
// problem: sparse products, dots against many basis vectors, updates,
// combinations, and the team of goroutines that runs them on strips of rows.
//
// A routine works on the half-open row range it is given, over slices that hold
// all local rows; columns of a basis are slices of one length, in float64 or
// float32, and arithmetic is in float64 always. Ranges begin at multiples of
// Tile, so that sums come out the same whether a strip is walked in one call or
// tile by tile. Routines that sum add to what stands in their output.
//
// Every sum has one fixed shape: inside a tile row i goes to lane i mod 8, the
// lanes are added by a fixed tree, tiles in order, strips in order. No product
// is fused with a sum. So the plain Go routines and the assembly give the same
// bits on every processor, with any number of threads.
//
// No routine allocates, does I/O or keeps a slice; they may run at the same
// time on ranges that do not overlap. They panic with a constant text when
// lengths disagree.
package kernel

// Tile is the number of rows over which one partial sum is taken; 8 KiB of
// float64, so that a vector's tile stays in the first cache while columns
// stream past it.
const Tile = 1024

const (
	stripRows = 8 * Tile // least rows of a strip, so that its start costs nothing
	maxStrips = 32       // bounds what the partial sums of all strips take
)

// Range is the half-open range of rows [Lo, Hi).
type Range struct{ Lo, Hi int }

// Len is the number of rows.
func (r Range) Len() int { return r.Hi - r.Lo }

// next cuts the first rows of r off, at most size of them.
func (r *Range) next(size int) Range {
	t := Range{r.Lo, min(r.Lo+size, r.Hi)}
	r.Lo = t.Hi
	return t
}

// Strips cuts rows into at most 32 ranges of nearly equal length for a Team. It
// depends on rows alone, never on threads; boundaries are multiples of Tile. It
// returns one empty range for no rows.
func Strips(rows int) []Range {
	tiles := (rows + Tile - 1) / Tile
	n := min(max(rows/stripRows, 1), maxStrips)
	strips := make([]Range, n)
	for i := range strips {
		strips[i] = Range{min(i*tiles/n*Tile, rows), min((i+1)*tiles/n*Tile, rows)}
	}
	return strips
}

// Partials keeps a row of partial sums for every strip, so that strips may run
// in any order and still be added in theirs.
type Partials struct {
	width int
	sums  []float64
}

// NewPartials makes room for that many strips of width sums each, all zero.
func NewPartials(strips, width int) *Partials {
	return &Partials{width: width, sums: make([]float64, strips*width)}
}

// Strip returns the sums of strip i, length width; it aliases p. Strips may be
// filled at the same time.
func (p *Partials) Strip(i int) []float64 {
	return p.sums[i*p.width : (i+1)*p.width : (i+1)*p.width]
}

// Clear sets every sum to zero.
func (p *Partials) Clear() { clear(p.sums) }

// Total adds the first len(dst) sums of every strip to dst, in strip order.
func (p *Partials) Total(dst []float64) {
	if len(dst) > p.width {
		panic("kernel: more totals than partial sums")
	}
	for at := 0; at < len(p.sums); at += p.width {
		part := p.sums[at : at+len(dst)]
		for j, v := range part {
			dst[j] += v
		}
	}
}
