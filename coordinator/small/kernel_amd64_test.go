//go:build amd64 && !noasm

package small

import "golang.org/x/sys/cpu"

// nativeKernels are the assembly kernels that this processor can run.
func nativeKernels() []kernels {
	var all []kernels
	if cpu.X86.HasAVX512F {
		all = append(all, kernels{"avx512",
			func(w *square, v, c []float64) {
				if len(v) > 0 {
					gramAVX512(&w[0], &v[0], &c[0], len(v)/lanes)
				}
			},
			func(c, v []float64, w *square) {
				if len(v) > 0 {
					updateAVX512(&c[0], &v[0], &w[0], len(v)/lanes)
				}
			}})
	}
	if cpu.X86.HasAVX2 {
		all = append(all, kernels{"avx2",
			func(w *square, v, c []float64) {
				if len(v) > 0 {
					gramAVX2(&w[0], &v[0], &c[0], len(v)/lanes)
					gramAVX2(&w[4*lanes], &v[4], &c[0], len(v)/lanes)
				}
			},
			func(c, v []float64, w *square) {
				if len(v) > 0 {
					updateAVX2(&c[0], &v[0], &w[0], len(v)/lanes)
					updateAVX2(&c[0], &v[4], &w[4*lanes], len(v)/lanes)
				}
			}})
	}
	return all
}
