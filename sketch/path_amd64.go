//go:build !noasm

package sketch

import (
	"math"

	"golang.org/x/sys/cpu"
)

//go:generate go -C ../worker/kernel/gen run . -set sketch -pkg sketch -out ../../../sketch/groups_amd64.s -stubs ../../../sketch/groups_amd64.go

// path is a set of instructions for the inner loop. All give the same bits.
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
	case cpu.X86.HasAVX512F && cpu.X86.HasAVX512DQ:
		return avx512
	case cpu.X86.HasAVX2:
		return avx2
	}
	return plain
}

// addGroups adds whole groups of 8 rows; see addGroupsGo.
func (o Operator) addGroups(dst, w []float64, group uint64) {
	if chosen == plain || (o.zeta != 4 && o.zeta != 8) || len(w) == 0 {
		o.addGroupsGo(dst, w, group)
		return
	}
	plan := o.plan(group)
	groups := len(w) / Lanes
	if chosen == avx512 {
		addGroupsAVX512(&dst[0], &w[0], groups, o.zeta, &plan)
	} else {
		addGroupsAVX2(&dst[0], &w[0], groups, o.zeta, &plan)
	}
}

// plan lays out what the assembly works from, in the order its generator knows:
// counters 64·G + t of the first sixteen hashes, the byte in dst where the
// segment of every eight begins, what counters grow by every sixteen hashes,
// seed, places and scale.
func (o Operator) plan(group uint64) (p [28]uint64) {
	zeta := uint64(o.zeta)
	for i := range uint64(16) {
		p[i] = 64*(group+i/zeta) + i%zeta
		p[16+i&7] = i % zeta * o.places * Lanes * 8
	}
	p[24], p[25], p[26], p[27] = 64*(16/zeta), o.seed, o.places, math.Float64bits(o.scale)
	return p
}
