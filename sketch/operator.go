// Package sketch holds the random linear maps S that shorten a vector of the
// length of the problem to a few hundred or thousand numbers and keep norms.
//
// An Operator is a sparse sign matrix of rows×n, where n is never asked for:
// column g of S follows from (seed, g) alone, so every row block sketches its
// own part and the parts add up to S·w whatever the cuts, as long as blocks
// begin at multiples of 8. Indices of w are global rows of the problem, zero
// based. The package does no I/O and starts no goroutine; an Operator is a
// value and may be shared. It does not sum over blocks: whoever adds partial
// sketches does so in a fixed order, if the same bits are to come out again.
package sketch

import "math"

// Lanes is the number of neighbouring rows that share one hash. Row blocks
// begin at multiples of it.
const Lanes = 8

// HoldRows is the length of the hold-out sketch. The norm of a sketch of 64
// rows spreads by about 1/√(2·64) = 9 %.
const HoldRows = 64

// holdZeta keeps the hold-out at two positions a segment.
const holdZeta = 4

// Operator is the sparse sign map S with zeta entries ±1/√zeta a column.
//
// Row g of the problem lies in group G = g>>3, lane l = g&7. For every t < zeta
// the group draws h = mix(seed xor mix(64·G + t)). Segment t owns rows/zeta
// sketch rows; the entry of row g stands there in row
//
//	8·⌊(h>>32)·(rows/(8·zeta)) / 2³²⌋ + (l xor r),  r = bits 8 to 10 of h,
//
// with the sign of bit l. The turn of the lanes by r is essential: without it a
// row reaches only the sketch rows congruent to it modulo 8, and vectors that
// live on every eighth row are not kept. E[SᵀS] = I. After the block form of
// the sparse sign embeddings in "Randomized numerical linear algebra:
// foundations and algorithms" (Acta Numerica 2020), section 9.
type Operator struct {
	rows, zeta int
	seed       uint64
	scale      float64 // 1/√zeta
	places     uint64  // groups of 8 sketch rows in a segment
}

// New returns the operator with that many sketch rows. It panics unless zeta
// lies in [1, 64] and rows is a positive multiple of 8·zeta.
func New(rows, zeta int, seed uint64) Operator {
	if zeta < 1 || zeta > 64 || rows <= 0 || rows%(Lanes*zeta) != 0 || rows > 1<<24 {
		panic("sketch: rows must be a positive multiple of 8·zeta, zeta in [1, 64]")
	}
	return Operator{
		rows: rows, zeta: zeta, seed: seed,
		scale:  1 / math.Sqrt(float64(zeta)),
		places: uint64(rows / (Lanes * zeta)),
	}
}

// HoldOut returns the operator of HoldRows rows that belongs to a cycle's seed
// and is independent of New(·, ·, seed). Nothing is ever minimised in it.
func HoldOut(seed uint64) Operator {
	return New(HoldRows, holdZeta, mix(seed^0x686f6c642d6f7574)) // the letters "hold-out"
}

// RowsFor is the number of sketch rows for that many columns at aspect 4,
// rounded up to a multiple of 8·zeta.
func RowsFor(columns, zeta int) int {
	unit := Lanes * zeta
	return max((4*columns+unit-1)/unit, 1) * unit
}

// CycleSeed is the seed of one cycle of a run: splitmix64 of the run's seed and
// the cycle's number. The same S in all cycles would correlate with r.
func CycleSeed(runSeed uint64, cycle int) uint64 {
	return mix(mix(runSeed) + uint64(cycle))
}

// Rows is the length of a sketch.
func (o Operator) Rows() int { return o.rows }

// Zeta is the number of nonzeros a column.
func (o Operator) Zeta() int { return o.zeta }

// Add adds S[:, firstRow:firstRow+len(w)]·w to dst.
//
//	dst       length Rows
//	w         any length; its last group of 8 rows may be partial
//	firstRow  global row of w[0], a multiple of 8
//
// Every entry of dst takes its terms in the order of rows, so that Add over
// [0, m) and then over [m, n) gives the bits of one Add over [0, n). Add panics
// if dst has another length or firstRow is no multiple of 8. len(w)·zeta
// additions; nothing is allocated.
func (o Operator) Add(dst, w []float64, firstRow int) {
	if len(dst) != o.rows || firstRow < 0 || firstRow%Lanes != 0 {
		panic("sketch: dst of another length, or a first row that is no multiple of 8")
	}
	group := uint64(firstRow / Lanes)
	whole := len(w) &^ (Lanes - 1)
	o.addGroups(dst, w[:whole], group)
	if whole < len(w) {
		o.addPartial(dst, w[whole:], group+uint64(whole/Lanes))
	}
}

// AddBoth adds S·w to dst and H·w to holdDst, as o.Add and hold.Add would, bit
// for bit, but reads w from memory once: w is taken in pieces that stay in the
// first cache between the two.
func (o Operator) AddBoth(hold Operator, dst, holdDst, w []float64, firstRow int) {
	const piece = 1024 // rows; 8 KiB
	for lo := 0; lo < len(w); lo += piece {
		hi := min(lo+piece, len(w))
		o.Add(dst, w[lo:hi], firstRow+lo)
		hold.Add(holdDst, w[lo:hi], firstRow+lo)
	}
}

// addGroupsGo is addGroups in plain Go: len(w) a multiple of 8, w[0] in lane 0
// of group. The assembly gives the same bits. The eight lanes are written out:
// constant shifts and indices make it three times as fast as a loop.
func (o Operator) addGroupsGo(dst, w []float64, group uint64) {
	segment := int(o.places) * Lanes
	for ; len(w) >= Lanes; w = w[Lanes:] {
		var v [Lanes]uint64
		for l, x := range (*[Lanes]float64)(w) {
			v[l] = math.Float64bits(float64(x * o.scale))
		}
		for t := range o.zeta {
			h := o.hash(group, t)
			at := t*segment + o.place(h)
			out := (*[Lanes]float64)(dst[at : at+Lanes])
			r := int(h>>8) & 7
			// Bit l of h becomes the sign of lane l.
			out[r] += math.Float64frombits(v[0] ^ h<<63)
			out[r^1] += math.Float64frombits(v[1] ^ h>>1<<63)
			out[r^2] += math.Float64frombits(v[2] ^ h>>2<<63)
			out[r^3] += math.Float64frombits(v[3] ^ h>>3<<63)
			out[r^4] += math.Float64frombits(v[4] ^ h>>4<<63)
			out[r^5] += math.Float64frombits(v[5] ^ h>>5<<63)
			out[r^6] += math.Float64frombits(v[6] ^ h>>6<<63)
			out[r^7] += math.Float64frombits(v[7] ^ h>>7<<63)
		}
		group++
	}
}

// addPartial adds a group of fewer than 8 rows.
func (o Operator) addPartial(dst, w []float64, group uint64) {
	segment := int(o.places) * Lanes
	for t := range o.zeta {
		h := o.hash(group, t)
		at := t*segment + o.place(h)
		r := int(h>>8) & 7
		for l, x := range w {
			v := float64(x * o.scale)
			dst[at+(l^r)] += math.Float64frombits(math.Float64bits(v) ^ h>>l<<63)
		}
	}
}

func (o Operator) hash(group uint64, t int) uint64 {
	return mix(o.seed ^ mix(group*64+uint64(t)))
}

// place is the first of the 8 sketch rows, within a segment, that h chooses.
func (o Operator) place(h uint64) int {
	return int((h>>32)*o.places>>32) * Lanes
}

// golden is 2⁶⁴ divided by the golden ratio, the step of splitmix64.
const golden = 0x9E3779B97F4A7C15

// mix is one output of splitmix64 from the state z (Steele, Lea and Flood,
// "Fast splittable pseudorandom number generators", 2014; constants as in the
// public-domain reference by S. Vigna, from memory).
func mix(z uint64) uint64 {
	z += golden
	z = (z ^ z>>30) * 0xBF58476D1CE4E5B9
	z = (z ^ z>>27) * 0x94D049BB133111EB
	return z ^ z>>31
}
