//go:build amd64 && !noasm

package small

import "golang.org/x/sys/cpu"

//go:generate go -C gen run . -out ../kernel_amd64.s -stubs ../kernel_stubs_amd64.go -pkg small

// gram adds Vᵀ·C to w, see gramGo; v and c have the same length.
func gram(w *square, v, c []float64) {
	n := min(len(v), len(c)) / lanes
	switch {
	case n == 0:
	case cpu.X86.HasAVX512F:
		gramAVX512(&w[0], &v[0], &c[0], n)
	case cpu.X86.HasAVX2:
		gramAVX2(&w[0], &v[0], &c[0], n)
		gramAVX2(&w[4*lanes], &v[4], &c[0], n)
	default:
		gramGo(w, v, c)
	}
}

// update subtracts V·W from C, see updateGo; c and v have the same length.
func update(c, v []float64, w *square) {
	n := min(len(v), len(c)) / lanes
	switch {
	case n == 0:
	case cpu.X86.HasAVX512F:
		updateAVX512(&c[0], &v[0], &w[0], n)
	case cpu.X86.HasAVX2:
		updateAVX2(&c[0], &v[0], &w[0], n)
		updateAVX2(&c[0], &v[4], &w[4*lanes], n)
	default:
		updateGo(c, v, w)
	}
}
