package problems

import (
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// LogNormal is −∇·(K∇u) on a grid of unit cells in two or three axes, K
// log-normal: ±2 standard deviations of log₁₀ K span the given decades, with
// the field smoothed by a Gaussian of standard deviation corr cells. Flux between
// cells by the harmonic mean of K; u = 0 on both faces of the first axis, none
// through the others. Symmetric positive definite, an M-matrix.
func LogNormal(shape []int, decades, corr float64, seed uint64) *csr.Matrix {
	field := smoothField(shape, corr, seed)
	for k, g := range field {
		field[k] = fixed.Exp10(g * decades / 4)
	}
	n := len(field)
	r := newRows(n, n, (2*len(shape)+1)*n)
	stride, at := strides(shape), make([]int, len(shape))
	low, up := make([]float64, len(shape)), make([]float64, len(shape))
	for k := range n {
		middle := 0.0
		for d, size := range shape {
			at[d] = k / stride[d] % size
			low[d], up[d] = 0, 0
			if at[d] > 0 {
				low[d] = harmonic(field[k-stride[d]], field[k])
			}
			if at[d] < size-1 {
				up[d] = harmonic(field[k], field[k+stride[d]])
			}
			middle += low[d] + up[d]
		}
		if at[0] == 0 {
			middle += 2 * field[k]
		}
		if at[0] == shape[0]-1 {
			middle += 2 * field[k]
		}
		starRow(r, k, stride, low, middle, up)
	}
	return r.m
}

func harmonic(a, b float64) float64 { return 2 / (1/a + 1/b) }

// starRow appends row k of a grid operator with couplings −low[d] and −up[d]
// to its neighbours along axis d, where they are not zero.
func starRow(r rows, k int, stride []int, low []float64, middle float64, up []float64) {
	for d := range stride {
		if low[d] != 0 {
			r.add(k-stride[d], -low[d])
		}
	}
	r.add(k, middle)
	for d := len(stride) - 1; d >= 0; d-- {
		if up[d] != 0 {
			r.add(k+stride[d], -up[d])
		}
	}
	r.end()
}

// strides are the distances in numbering between neighbours along each axis.
func strides(shape []int) []int {
	s := make([]int, len(shape))
	step := 1
	for d := len(shape) - 1; d >= 0; d-- {
		s[d] = step
		step *= shape[d]
	}
	return s
}

// smoothField is white noise under a Gaussian filter of standard deviation corr
// cells, wrapped around and cut at four standard deviations, then scaled to a
// sample standard deviation of 1.
func smoothField(shape []int, corr float64, seed uint64) []float64 {
	n := 1
	for _, size := range shape {
		n *= size
	}
	s, field := fixed.NewStream(seed, streamField), make([]float64, n)
	for i := range field {
		field[i] = s.Normal(i)
	}
	weights := gaussian(corr)
	for d, step := range strides(shape) {
		field = smoothAxis(field, shape[d], step, weights)
	}
	mean, square := 0.0, 0.0
	for _, v := range field {
		mean += v
	}
	mean /= float64(n)
	for _, v := range field {
		square += float64((v - mean) * (v - mean))
	}
	deviation := math.Sqrt(square / float64(n))
	for i := range field {
		field[i] /= deviation
	}
	return field
}

// gaussian is half of the filter's weights, the centre first; the whole filter
// sums to 1.
func gaussian(corr float64) []float64 {
	w := make([]float64, int(4*corr+0.5)+1)
	sum := 0.0
	for i := range w {
		t := float64(i) / corr
		w[i] = fixed.Exp(-0.5 * t * t)
		sum += w[i]
		if i > 0 {
			sum += w[i]
		}
	}
	for i := range w {
		w[i] /= sum
	}
	return w
}

// smoothAxis filters along the axis of the given size and stride, wrapped.
func smoothAxis(field []float64, size, step int, w []float64) []float64 {
	out := make([]float64, len(field))
	for k := range field {
		at := k / step % size
		base := k - at*step
		sum := float64(w[0] * field[k])
		for i := 1; i < len(w); i++ {
			left, right := (at-i%size+size)%size, (at+i)%size
			sum += float64(w[i] * (field[base+left*step] + field[base+right*step]))
		}
		out[k] = sum
	}
	return out
}
