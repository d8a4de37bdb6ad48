package basis

import (
	"fmt"
	"unsafe"

	"rowstead/worker/kernel"
)

// columns keeps every vector as a column of one slab.
type columns[F kernel.Element] struct {
	slab []F
	cols [][]F // the vectors, the newest last; len is the number of vectors
	room [][]F // all columns of the slab
	next kernel.Next[F]
}

// Reset implements Basis.
func (b *columns[F]) Reset(room Room, each func(task func(r kernel.Range))) {
	if len(b.room) < room.Capacity || (len(b.room) > 0 && len(b.room[0]) != room.Rows) {
		b.slab, b.room, b.cols, b.next = nil, nil, nil, kernel.Next[F]{}
		b.slab, b.room = newSlab[F](room.Rows, room.Capacity)
		each(func(r kernel.Range) { // touch
			for _, c := range b.room {
				clear(c[r.Lo:r.Hi])
			}
		})
	}
	b.cols = b.room[:0]
}

// newSlab returns memory for so many columns, not yet touched.
func newSlab[F kernel.Element](rows, columns int) (slab []F, room [][]F) {
	stride := columnStride(rows)
	slab = make([]F, columns*stride)
	if len(slab) > 0 {
		askForHugePages(unsafe.Pointer(&slab[0]), len(slab)*int(unsafe.Sizeof(slab[0])))
	}
	for j := range columns {
		room = append(room, slab[j*stride:j*stride+rows:j*stride+rows])
	}
	return slab, room
}

// columnStride is the distance of two columns: an odd number of cache lines of 8
// numbers, so that the same rows of many columns do not compete for one place in
// the cache when rows is a power of two.
func columnStride(rows int) int {
	lines := (rows + 7) / 8
	return 8 * (lines | 1)
}

// Len implements Basis.
func (b *columns[F]) Len() int { return len(b.cols) }

// Bytes implements Basis.
func (b *columns[F]) Bytes() int64 {
	var f F
	return int64(len(b.slab)) * int64(unsafe.Sizeof(f))
}

// Check implements Basis.
func (b *columns[F]) Check(s Step, window int) error {
	j := len(b.cols)
	switch {
	case j == len(b.room):
		return fmt.Errorf("basis: no room for vector %d", j)
	case s.Lo < 0 || s.Lo+len(s.H) > j:
		return fmt.Errorf("basis: a step against vectors [%d, %d) of %d", s.Lo, s.Lo+len(s.H), j)
	case s.Norm == 0 || s.Norm != s.Norm:
		return fmt.Errorf("basis: a step with norm %v", s.Norm)
	case window < 1:
		return fmt.Errorf("basis: a window of %d", window)
	}
	return nil
}

// Begin implements Basis.
func (b *columns[F]) Begin(w []float64, s Step, window int) {
	j := len(b.cols)
	b.begin(w, s, b.cols[s.Lo:s.Lo+len(s.H)], b.room[j], b.cols[max(0, j+1-window):])
	b.cols = b.room[:j+1]
}

// begin sets up the making of into from w against the vectors against.
func (b *columns[F]) begin(w []float64, s Step, against [][]F, into []F, window [][]F) {
	b.next = kernel.Next[F]{W: w, Cols: against, H: s.H, Norm: s.Norm, B: into, Window: window}
}

// Form implements Basis.
func (b *columns[F]) Form(gram []float64, r kernel.Range) { b.next.Form(gram, r) }

// Newest implements Basis.
func (b *columns[F]) Newest(scratch []float64, r kernel.Range) []float64 {
	return widened(b.next.B[r.Lo:r.Hi], scratch)
}

// widened is v itself where it is in 64 bits, and otherwise scratch, filled.
func widened[F kernel.Element](v []F, scratch []float64) []float64 {
	if same, ok := any(v).([]float64); ok {
		return same
	}
	kernel.Widen(scratch, v)
	return scratch
}

// Dots implements Basis.
func (b *columns[F]) Dots(out, w []float64, r kernel.Range) {
	kernel.Dots(out, w, b.cols[len(b.cols)-len(out):], r)
}

// Reduce implements Basis.
func (b *columns[F]) Reduce(out, w, h []float64, r kernel.Range) {
	kernel.Reduce(out, w, b.cols, h, r)
}

// Combine implements Basis.
func (b *columns[F]) Combine(dst [][]float64, t []float64, ldt, k int, r kernel.Range) {
	kernel.Combine(dst, b.cols[:k], t, ldt, r)
}

// Truncate drops the vectors from j on.
func (b *columns[F]) Truncate(j int) { b.cols = b.cols[:j] }
