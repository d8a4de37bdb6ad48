package main

import (
	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
)

// ahead is how many bytes of columns are asked for before they are needed, and
// half of those of values.
const ahead = 2048

// product writes kernel's sparse product: one row after the other, entries in
// order, no bounds checks. Scalar loads of x beat gathers on many processors and
// keep the order of the sum; what it saves is all else that a Go loop does.
func product() {
	const name = "mulRows"
	TEXT(name, NOSPLIT, "func(y *float64, ends *int, col *int32, val, x *float64, first, rows int)")
	Pragma("noescape")
	Doc(name+" sets y[i] to row i of A·x: entries from the end of the row before,", "from first for row 0, to ends[i]. It is baseline SSE2 and runs everywhere.")
	y, ends := Load(Param("y"), GP64()), Load(Param("ends"), GP64())
	col, val, x := Load(Param("col"), GP64()), Load(Param("val"), GP64()), Load(Param("x"), GP64())
	k, rows, i := Load(Param("first"), GP64()), Load(Param("rows"), GP64()), GP64()
	XORQ(i, i)
	TESTQ(rows, rows)
	JEQ(LabelRef("end"))

	Label("row")
	end, last := GP64(), GP64()
	sum := XMM()
	MOVQ(Mem{Base: ends, Index: i, Scale: 8}, end)
	XORPD(sum, sum)
	entry := func(d int) {
		c, p := GP64(), XMM()
		MOVLQSX(Mem{Base: col, Index: k, Scale: 4, Disp: 4 * d}, c)
		MOVSD(Mem{Base: val, Index: k, Scale: 8, Disp: 8 * d}, p)
		MULSD(Mem{Base: x, Index: c, Scale: 8}, p)
		ADDSD(p, sum)
	}
	// Four entries at a time while four are left, then one by one.
	LEAQ(Mem{Base: end, Disp: -4}, last)
	CMPQ(k, last)
	JGT(LabelRef("few"))
	Label("four")
	PREFETCHT0(Mem{Base: val, Index: k, Scale: 8, Disp: 2 * ahead})
	PREFETCHT0(Mem{Base: col, Index: k, Scale: 4, Disp: ahead})
	for d := range 4 {
		entry(d)
	}
	ADDQ(U8(4), k)
	CMPQ(k, last)
	JLE(LabelRef("four"))
	Label("few")
	CMPQ(k, end)
	JGE(LabelRef("store"))
	Label("one")
	entry(0)
	INCQ(k)
	CMPQ(k, end)
	JLT(LabelRef("one"))
	Label("store")
	MOVSD(sum, Mem{Base: y, Index: i, Scale: 8})
	INCQ(i)
	CMPQ(i, rows)
	JLT(LabelRef("row"))
	Label("end")
	RET()
}
