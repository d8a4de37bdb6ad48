package spacetest

import (
	"math"

	"rowstead/coordinator/method"
)

// sketch returns S·v and S'·v of cycle c; empty when c takes no sketches.
func (s *Simple) sketch(c method.Cycle, v []float64) (sv, hold []float64) {
	if c.SketchRows == 0 {
		return nil, nil
	}
	return sketchVector(v, c.SketchRows, c.Zeta, c.Seed),
		sketchVector(v, method.HoldRows, holdZeta, splitmix(c.Seed^holdMark))
}

const (
	holdZeta = 4                  // 64 rows are two groups of 8 a segment
	holdMark = 0x686f6c642d6f7574 // "hold-out"
)

// sketchVector returns S·v: row g of the problem is lane l = g mod 8 of group
// G = g div 8. For t < zeta, h = splitmix(seed xor splitmix(64·G + t)) names a
// group of 8 sketch rows within segment t, a turn of the lanes and the signs.
func sketchVector(v []float64, rows, zeta int, seed uint64) []float64 {
	out := make([]float64, rows)
	groups := uint64(rows / zeta / 8)
	scale := 1 / math.Sqrt(float64(zeta))
	for g := range v {
		group, lane := uint64(g>>3), g&7
		for t := range zeta {
			h := splitmix(seed ^ splitmix(64*group+uint64(t)))
			place := int(((h >> 32) * groups) >> 32)
			turn := int(h>>8) & 7
			value := v[g] * scale
			if h>>lane&1 == 1 {
				value = -value
			}
			out[t*rows/zeta+8*place+(lane^turn)] += value
		}
	}
	return out
}

// splitmix is the finalizer of the SplitMix64 generator (Steele, Lea and Flood,
// "Fast splittable pseudorandom number generators").
func splitmix(z uint64) uint64 {
	z += 0x9E3779B97F4A7C15
	z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9
	z = (z ^ (z >> 27)) * 0x94D049BB133111EB
	return z ^ (z >> 31)
}
