//go:build !noasm

package kernel

import (
	"unsafe"

	"golang.org/x/sys/cpu"
)

//go:generate go -C gen run . -set vectors -pkg kernel -out ../vectors_amd64.s -stubs ../vectors_amd64.go
//go:generate go -C gen run . -set product -pkg kernel -out ../product_amd64.s -stubs ../product_amd64.go

// path is a set of instructions for the inner loops. All give the same bits.
type path int

const (
	plain path = iota
	avx2
	avx512
)

// chosen is the best path of this processor; tests alone set it to another.
var chosen = best()

func best() path {
	switch {
	case cpu.X86.HasAVX512F && cpu.X86.HasAVX512DQ && cpu.X86.HasBMI2:
		return avx512
	case cpu.X86.HasAVX2:
		return avx2
	}
	return plain
}

// isDouble tells the two elements apart; it is a constant in each instance.
func isDouble[F Element]() bool {
	var f F
	return unsafe.Sizeof(f) == 8
}

func as64[F Element](c []F) *float64 { return (*float64)(unsafe.Pointer(unsafe.SliceData(c))) }
func as32[F Element](c []F) *float32 { return (*float32)(unsafe.Pointer(unsafe.SliceData(c))) }

// dot4 returns the dots of w with four columns of its length. It asks for what
// stands ahead rows further on in them, which may lie beyond their end.
func dot4[F Element](w []float64, c0, c1, c2, c3 []F, ahead int) (sums [4]float64) {
	n := len(w)
	c0, c1, c2, c3 = c0[:n], c1[:n], c2[:n], c3[:n]
	switch {
	case chosen == plain:
		return dot4Go(w, c0, c1, c2, c3)
	case chosen == avx512 && isDouble[F]():
		dot4AVX512(&sums, as64(w), as64(c0), as64(c1), as64(c2), as64(c3), n, ahead)
	case chosen == avx512:
		dot4SingleAVX512(&sums, as64(w), as32(c0), as32(c1), as32(c2), as32(c3), n, ahead)
	case isDouble[F]():
		dot4AVX2(&sums, as64(w), as64(c0), as64(c1), as64(c2), as64(c3), n, ahead)
	default:
		dot4SingleAVX2(&sums, as64(w), as32(c0), as32(c1), as32(c2), as32(c3), n, ahead)
	}
	return sums
}

// dot1 returns the dot of w with one column of its length.
func dot1[F Element](w []float64, c []F, ahead int) float64 {
	var sums [1]float64
	n := len(w)
	c = c[:n]
	switch {
	case chosen == plain:
		return dot1Go(w, c)
	case chosen == avx512 && isDouble[F]():
		dot1AVX512(&sums, as64(w), as64(c), n, ahead)
	case chosen == avx512:
		dot1SingleAVX512(&sums, as64(w), as32(c), n, ahead)
	case isDouble[F]():
		dot1AVX2(&sums, as64(w), as64(c), n, ahead)
	default:
		dot1SingleAVX2(&sums, as64(w), as32(c), n, ahead)
	}
	return sums[0]
}

// update4 sets d ← (((w − h₀c₀) − h₁c₁) − h₂c₂) − h₃c₃; d may be w.
func update4[F Element](d, w []float64, h *[4]float64, c0, c1, c2, c3 []F) {
	n := len(w)
	d = d[:n]
	c0, c1, c2, c3 = c0[:n], c1[:n], c2[:n], c3[:n]
	switch {
	case chosen == plain:
		update4Go(d, w, h, c0, c1, c2, c3)
	case chosen == avx512 && isDouble[F]():
		update4AVX512(as64(d), as64(w), h, as64(c0), as64(c1), as64(c2), as64(c3), n)
	case chosen == avx512:
		update4SingleAVX512(as64(d), as64(w), h, as32(c0), as32(c1), as32(c2), as32(c3), n)
	case isDouble[F]():
		update4AVX2(as64(d), as64(w), h, as64(c0), as64(c1), as64(c2), as64(c3), n)
	default:
		update4SingleAVX2(as64(d), as64(w), h, as32(c0), as32(c1), as32(c2), as32(c3), n)
	}
}

// update1 sets d ← w − factor·c; d may be w.
func update1[F Element](d, w []float64, factor float64, c []F) {
	n, h := len(w), [1]float64{factor}
	c, d = c[:n], d[:n]
	switch {
	case chosen == plain:
		update1Go(d, w, factor, c)
	case chosen == avx512 && isDouble[F]():
		update1AVX512(as64(d), as64(w), &h, as64(c), n)
	case chosen == avx512:
		update1SingleAVX512(as64(d), as64(w), &h, as32(c), n)
	case isDouble[F]():
		update1AVX2(as64(d), as64(w), &h, as64(c), n)
	default:
		update1SingleAVX2(as64(d), as64(w), &h, as32(c), n)
	}
}

// scaleInto sets b ← tile·factor, rounded to F, and tile ← b.
func scaleInto[F Element](b []F, tile []float64, factor float64) {
	n := len(tile)
	b = b[:n]
	switch {
	case chosen == plain:
		scaleGo(b, tile, factor)
	case chosen == avx512 && isDouble[F]():
		scaleAVX512(as64(b), as64(tile), &factor, n)
	case chosen == avx512:
		scaleSingleAVX512(as32(b), as64(tile), &factor, n)
	case isDouble[F]():
		scaleAVX2(as64(b), as64(tile), &factor, n)
	default:
		scaleSingleAVX2(as32(b), as64(tile), &factor, n)
	}
}

// mul sets out[i] to row i of A·x; see mulGo.
func mul(out []float64, ends []int, col []int32, val, x []float64, first int) {
	if chosen == plain || len(col) == 0 {
		mulGo(out, ends, col, val, x, first)
		return
	}
	mulRows(&out[0], &ends[0], &col[0], &val[0], unsafe.SliceData(x), first, len(out))
}
