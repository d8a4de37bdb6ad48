// Command gen writes the assembly of the two strip kernels of package small,
// Vᵀ·C and C − V·W, for AVX2 and AVX-512. Products are rounded before they are
// summed, and every sum runs over ascending indices, so that both give the bits
// of the Go twins. Run it by go generate in the folder above.
package main

import (
	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	. "github.com/mmcloughlin/avo/reg"
)

const row = 64 // bytes of a row of a strip

func main() {
	ConstraintExpr("amd64,!noasm")
	gram512()
	update512()
	gram2()
	update2()
	Generate()
}

// at is element j of the row that p points to.
func at(p Register, element int) Mem { return Mem{Base: p, Disp: 8 * element} }

// loop runs body for a row at p and at q until n rows are done, n ≥ 1.
func loop(p, q, n Register, body func()) {
	Label("rows")
	body()
	ADDQ(Imm(row), p)
	ADDQ(Imm(row), q)
	DECQ(n)
	JNZ(LabelRef("rows"))
}

func gram512() {
	TEXT("gramAVX512", NOSPLIT, "func(w, v, c *float64, n int)")
	Doc("gramAVX512 is gramGo for n ≥ 1 rows.")
	Pragma("noescape")
	w, v, c, n := Load(Param("w"), GP64()), Load(Param("v"), GP64()), Load(Param("c"), GP64()), Load(Param("n"), GP64())
	var sum [8]VecVirtual
	for j := range sum {
		sum[j] = ZMM()
		VMOVUPD(at(w, 8*j), sum[j])
	}
	loop(v, c, n, func() {
		x := ZMM()
		VMOVUPD(at(c, 0), x)
		for j := range sum {
			product := ZMM()
			VMULPD_BCST(at(v, j), x, product)
			VADDPD(product, sum[j], sum[j])
		}
	})
	for j := range sum {
		VMOVUPD(sum[j], at(w, 8*j))
	}
	VZEROUPPER()
	RET()
}

func update512() {
	TEXT("updateAVX512", NOSPLIT, "func(c, v, w *float64, n int)")
	Doc("updateAVX512 is updateGo for n ≥ 1 rows.")
	Pragma("noescape")
	c, v, w, n := Load(Param("c"), GP64()), Load(Param("v"), GP64()), Load(Param("w"), GP64()), Load(Param("n"), GP64())
	var f [8]VecVirtual
	for j := range f {
		f[j] = ZMM()
		VMOVUPD(at(w, 8*j), f[j])
	}
	loop(v, c, n, func() {
		x := ZMM()
		VMOVUPD(at(c, 0), x)
		for j := range f {
			product := ZMM()
			VMULPD_BCST(at(v, j), f[j], product)
			VSUBPD(product, x, x)
		}
		VMOVUPD(x, at(c, 0))
	})
	VZEROUPPER()
	RET()
}

// gram2 does four columns of V in one pass: eight sums, two rows of C, one
// broadcast and two products fill the sixteen registers but three.
func gram2() {
	TEXT("gramAVX2", NOSPLIT, "func(w, v, c *float64, n int)")
	Doc("gramAVX2 is gramGo for n ≥ 1 rows and columns 0 … 3 of V.")
	Pragma("noescape")
	w, v, c, n := Load(Param("w"), GP64()), Load(Param("v"), GP64()), Load(Param("c"), GP64()), Load(Param("n"), GP64())
	var sum [8]VecVirtual
	for j := range sum {
		sum[j] = YMM()
		VMOVUPD(at(w, 4*j), sum[j])
	}
	loop(v, c, n, func() {
		lo, hi, f := YMM(), YMM(), YMM()
		VMOVUPD(at(c, 0), lo)
		VMOVUPD(at(c, 4), hi)
		for j := range 4 {
			a, b := YMM(), YMM()
			VBROADCASTSD(at(v, j), f)
			VMULPD(f, lo, a)
			VMULPD(f, hi, b)
			VADDPD(a, sum[2*j], sum[2*j])
			VADDPD(b, sum[2*j+1], sum[2*j+1])
		}
	})
	for j := range sum {
		VMOVUPD(sum[j], at(w, 4*j))
	}
	VZEROUPPER()
	RET()
}

// update2 does four columns of V in one pass.
func update2() {
	TEXT("updateAVX2", NOSPLIT, "func(c, v, w *float64, n int)")
	Doc("updateAVX2 is updateGo for n ≥ 1 rows and columns 0 … 3 of V.")
	Pragma("noescape")
	c, v, w, n := Load(Param("c"), GP64()), Load(Param("v"), GP64()), Load(Param("w"), GP64()), Load(Param("n"), GP64())
	var f [8]VecVirtual
	for j := range f {
		f[j] = YMM()
		VMOVUPD(at(w, 4*j), f[j])
	}
	loop(v, c, n, func() {
		lo, hi, x := YMM(), YMM(), YMM()
		VMOVUPD(at(c, 0), lo)
		VMOVUPD(at(c, 4), hi)
		for j := range 4 {
			a, b := YMM(), YMM()
			VBROADCASTSD(at(v, j), x)
			VMULPD(x, f[2*j], a)
			VMULPD(x, f[2*j+1], b)
			VSUBPD(a, lo, lo)
			VSUBPD(b, hi, hi)
		}
		VMOVUPD(lo, at(c, 0))
		VMOVUPD(hi, at(c, 4))
	})
	VZEROUPPER()
	RET()
}
