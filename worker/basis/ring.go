package basis

import (
	"fmt"

	"rowstead/worker/kernel"
)

// extra is how many vectors a ring keeps beyond the window: the one being made,
// and two so that a step may reach back a little further.
const extra = 3

// Ring is the replay form: it keeps the last Window+3 vectors and the
// coefficients of all steps. Rewind begins the recurrence again; the steps are
// then taken by Again instead of Begin, and every vector comes out to the last
// bit as before, for the same loops run on the same numbers.
type Ring struct {
	slab    []float64
	slots   [][]float64
	steps   []Step // of all vectors of the cycle
	at      int    // vectors made since Reset or Rewind
	next    kernel.Next[float64]
	against [][]float64 // room for next.Cols
	window  [][]float64 // room for next.Window
	most    int         // capacity
	rows    int
}

// Reset implements Basis.
func (b *Ring) Reset(room Room, each func(task func(r kernel.Range))) {
	slots := min(room.Window+extra, max(room.Capacity, 1))
	if len(b.slots) < slots || b.rows != room.Rows {
		b.slab, b.slots, b.rows = nil, nil, room.Rows
		b.slab, b.slots = newSlab[float64](room.Rows, slots)
		each(func(r kernel.Range) {
			for _, c := range b.slots {
				clear(c[r.Lo:r.Hi])
			}
		})
	}
	b.most, b.at = room.Capacity, 0
	b.steps = b.steps[:0]
}

// slot is where vector j stands as long as it is kept.
func (b *Ring) slot(j int) []float64 { return b.slots[j%len(b.slots)] }

// Len implements Basis.
func (b *Ring) Len() int { return b.at }

// Bytes implements Basis.
func (b *Ring) Bytes() int64 {
	n := len(b.slab)
	for _, s := range b.steps {
		n += len(s.H) + 5
	}
	return 8 * int64(n)
}

// Check implements Basis.
func (b *Ring) Check(s Step, window int) error {
	j := b.at
	oldest := max(0, j+1-len(b.slots)) // after the new one has its slot
	switch {
	case j == b.most:
		return fmt.Errorf("basis: no room for vector %d", j)
	case len(s.H) > 0 && (s.Lo < oldest || s.Lo+len(s.H) > j):
		return fmt.Errorf("basis: a step against vectors [%d, %d), replay keeps [%d, %d)", s.Lo, s.Lo+len(s.H), oldest, j)
	case s.Norm == 0 || s.Norm != s.Norm:
		return fmt.Errorf("basis: a step with norm %v", s.Norm)
	case window < 1 || max(0, j+1-window) < oldest:
		return fmt.Errorf("basis: a window of %d, replay keeps %d vectors", window, len(b.slots))
	}
	return nil
}

// Begin implements Basis.
func (b *Ring) Begin(w []float64, s Step, window int) {
	s.H = append([]float64(nil), s.H...)
	b.steps = append(b.steps, s)
	b.begin(w, s, window)
}

func (b *Ring) begin(w []float64, s Step, window int) {
	j := b.at
	b.against, b.window = b.against[:0], b.window[:0]
	for i := range s.H {
		b.against = append(b.against, b.slot(s.Lo+i))
	}
	for i := max(0, j+1-window); i < j; i++ {
		b.window = append(b.window, b.slot(i))
	}
	b.next = kernel.Next[float64]{W: w, Cols: b.against, H: s.H, Norm: s.Norm, B: b.slot(j), Window: b.window}
	b.at++
}

// Rewind begins the recurrence again with vector 0 and returns the number of
// vectors that can be made again.
func (b *Ring) Rewind() int {
	b.at = 0
	return len(b.steps)
}

// Again makes the next vector as it was made the first time; Form follows. It
// takes no dots.
func (b *Ring) Again(w []float64) { b.begin(w, b.steps[b.at], 1) }

// Form implements Basis.
func (b *Ring) Form(gram []float64, r kernel.Range) { b.next.Form(gram, r) }

// Newest implements Basis.
func (b *Ring) Newest(_ []float64, r kernel.Range) []float64 { return b.next.B[r.Lo:r.Hi] }

// Dots implements Basis. It panics when more vectors are asked for than kept;
// see Most.
func (b *Ring) Dots(out, w []float64, r kernel.Range) {
	var some [1][]float64
	for i := range out {
		some[0] = b.slot(b.at - len(out) + i)
		kernel.Dots(out[i:i+1], w, some[:], r)
	}
}

// Most is the number of vectors that are kept, the newest included.
func (b *Ring) Most() int { return len(b.slots) }

// Reduce implements Basis; the whole basis is never at hand, so it panics.
func (b *Ring) Reduce(_, _, _ []float64, _ kernel.Range) {
	panic("basis: Reduce in replay form")
}

// Combine implements Basis for the newest vector alone, as replay forms sums: it
// adds t[c·ldt+k−1]·b_{k−1} to every dst[c], and k must be Len.
func (b *Ring) Combine(dst [][]float64, t []float64, ldt, k int, r kernel.Range) {
	if k != b.at {
		panic("basis: Combine in replay form is for the newest vector")
	}
	for c, d := range dst {
		at := c*ldt + k - 1
		kernel.Correct(d, [][]float64{b.next.B}, t[at:at+1], r)
	}
}
