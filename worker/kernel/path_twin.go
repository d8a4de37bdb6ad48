//go:build !amd64 || noasm

package kernel

// The inner loops in plain Go, where there is no assembly.

func dot4[F Element](w []float64, c0, c1, c2, c3 []F, _ int) [4]float64 {
	return dot4Go(w, c0, c1, c2, c3)
}

func dot1[F Element](w []float64, c []F, _ int) float64 { return dot1Go(w, c) }

func update4[F Element](d, w []float64, h *[4]float64, c0, c1, c2, c3 []F) {
	update4Go(d, w, h, c0, c1, c2, c3)
}

func update1[F Element](d, w []float64, h float64, c []F) { update1Go(d, w, h, c) }

func scaleInto[F Element](b []F, tile []float64, factor float64) { scaleGo(b, tile, factor) }

func mul(out []float64, ends []int, col []int32, val, x []float64, first int) {
	mulGo(out, ends, col, val, x, first)
}
