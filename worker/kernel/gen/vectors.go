package main

import (
	"fmt"
	"strings"

	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	. "github.com/mmcloughlin/avo/reg"
)

// vectors writes kernel's dots, updates and scalings of basis columns.
func vectors() {
	tables := newMaskTables()
	for _, s := range []isa{isaAVX2, isaAVX512} {
		for _, e := range []element{double, single} {
			for _, k := range []int{4, 1} {
				dot(s, e, k, tables)
				update(s, e, k, tables)
			}
			scale(s, e, tables)
		}
	}
}

// columnParams are the names of k column parameters.
func columnParams(k int) (names []string) {
	for j := range k {
		names = append(names, fmt.Sprintf("c%d", j))
	}
	return names
}

func loadAll(names []string) (regs []Register) {
	for _, n := range names {
		regs = append(regs, Load(Param(n), GP64()))
	}
	return regs
}

// columnAhead is how many bytes of a column are asked for before they are needed.
const columnAhead = 1024

// fetch asks for what a column holds columnAhead bytes further on.
func fetch(e element, base, at Register) {
	PREFETCHT0(Mem{Base: base, Index: at, Scale: uint8(e.size), Disp: columnAhead})
}

// dot writes sums[j] = w·c_j over n rows, in eight lanes, and asks for the rows
// that stand ahead rows further on in the columns.
func dot(s isa, e element, k int, tables maskTables) {
	name := fmt.Sprintf("dot%d%s%s", k, e.name, s.name)
	names := columnParams(k)
	TEXT(name, NOSPLIT, fmt.Sprintf("func(sums *[%d]float64, w *float64, %s *%s, n, ahead int)", k, strings.Join(names, ", "), e.goType))
	Pragma("noescape")
	Doc(fmt.Sprintf("%s sets sums[j] to the dot of w and column j over n rows.", name))
	w, cols, n := Load(Param("w"), GP64()), loadAll(names), Load(Param("n"), GP64())
	ahead := Load(Param("ahead"), GP64())
	acc := make([]eight, k)
	for j := range acc {
		acc[j] = s.zero()
	}
	s.rows(name, n, tables, func(at Register, m *mask) {
		further := GP64()
		LEAQ(Mem{Base: at, Index: ahead, Scale: 1}, further)
		v := s.load(double, w, at, m)
		for j, c := range cols {
			PREFETCHT0(Mem{Base: c, Index: further, Scale: uint8(e.size)})
			x := s.load(e, c, at, m)
			for p := range x {
				VMULPD(v[p], x[p], x[p])
				VADDPD(x[p], acc[j][p], acc[j][p])
			}
		}
	})
	sums := Mem{Base: Load(Param("sums"), GP64())}
	for j := range acc {
		s.sum(acc[j], sums.Offset(8*j))
	}
	VZEROUPPER()
	RET()
}

// update writes d ← w − Σ_j h[j]·c_j over n rows, column after column; d may be w.
func update(s isa, e element, k int, tables maskTables) {
	name := fmt.Sprintf("update%d%s%s", k, e.name, s.name)
	names := columnParams(k)
	TEXT(name, NOSPLIT, fmt.Sprintf("func(d, w *float64, h *[%d]float64, %s *%s, n int)", k, strings.Join(names, ", "), e.goType))
	Pragma("noescape")
	Doc(fmt.Sprintf("%s sets d to w less h[j] times column j over n rows.", name))
	d, w := Load(Param("d"), GP64()), Load(Param("w"), GP64())
	cols, n := loadAll(names), Load(Param("n"), GP64())
	h := Mem{Base: Load(Param("h"), GP64())}
	coefficients := make([]VecVirtual, k)
	for j := range coefficients {
		coefficients[j] = s.spread(h.Offset(8 * j))
	}
	s.rows(name, n, tables, func(at Register, m *mask) {
		fetch(double, w, at)
		v := s.load(double, w, at, m)
		for j, c := range cols {
			fetch(e, c, at)
			x := s.load(e, c, at, m)
			for p := range x {
				VMULPD(coefficients[j], x[p], x[p])
				VSUBPD(x[p], v[p], v[p])
			}
		}
		s.store(double, v, d, at, m, false)
	})
	VZEROUPPER()
	RET()
}

// scale writes b ← tile·factor, rounded to the element, and tile ← b.
func scale(s isa, e element, tables maskTables) {
	name := "scale" + e.name + s.name
	TEXT(name, NOSPLIT, fmt.Sprintf("func(b *%s, tile *float64, factor *float64, n int)", e.goType))
	Pragma("noescape")
	Doc(name + " sets b to tile times factor and tile to b, as stored, over n rows.")
	b, tile := Load(Param("b"), GP64()), Load(Param("tile"), GP64())
	factor := s.spread(Mem{Base: Load(Param("factor"), GP64())})
	n := Load(Param("n"), GP64())
	s.rows(name, n, tables, func(at Register, m *mask) {
		fetch(e, b, at)
		v := s.load(double, tile, at, m)
		for _, r := range v {
			VMULPD(factor, r, r)
		}
		s.store(e, v, b, at, m, true)
		s.store(double, v, tile, at, m, false)
	})
	VZEROUPPER()
	RET()
}
