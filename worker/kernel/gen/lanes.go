package main

import (
	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	. "github.com/mmcloughlin/avo/reg"
)

// isa is an instruction set that takes eight float64 lanes as one or two
// registers.
type isa struct {
	name  string
	parts int // registers of eight lanes
	vec   func() VecVirtual
}

var (
	isaAVX2   = isa{"AVX2", 2, YMM}
	isaAVX512 = isa{"AVX512", 1, ZMM}
)

// element is the stored form of a column.
type element struct {
	name, goType string
	size         int
}

var (
	double = element{"", "float64", 8}
	single = element{"Single", "float32", 4}
)

// eight are the registers of eight lanes.
type eight []VecVirtual

func (s isa) eight() eight {
	v := make(eight, s.parts)
	for i := range v {
		v[i] = s.vec()
	}
	return v
}

// zero returns eight lanes of zero.
func (s isa) zero() eight {
	v := s.eight()
	for _, r := range v {
		VXORPD(r, r, r)
	}
	return v
}

// spread returns eight lanes of the float64 in memory.
func (s isa) spread(m Mem) VecVirtual {
	v := s.vec()
	VBROADCASTSD(m, v)
	return v
}

// mask chooses the first rows of a last, partial group; nil chooses all.
type mask struct {
	k             Register // AVX-512
	wide, narrow4 Mem      // AVX2: tables of −1 and 0, from the lane of row 0
}

// maskTables are the constants of AVX2 masks, made once a file.
type maskTables struct{ wide, narrow Mem }

func newMaskTables() maskTables {
	wide := GLOBL("mask64", RODATA|NOPTR)
	for l := range 16 {
		DATA(8*l, U64(^uint64(0)*uint64(1-l/8)))
	}
	narrow := GLOBL("mask32", RODATA|NOPTR)
	for l := range 16 {
		DATA(4*l, U32(^uint32(0)*uint32(1-l/8)))
	}
	return maskTables{wide, narrow}
}

// rows writes the loop over n rows: body for every group of eight, once more
// with a mask if rows are left. at is the row, for addresses.
func (s isa) rows(name string, n Register, tables maskTables, body func(at Register, m *mask)) {
	whole, i := GP64(), GP64()
	XORQ(i, i)
	MOVQ(n, whole)
	ANDQ(I8(-8), whole)
	JEQ(LabelRef(name + "_rest"))
	Label(name + "_eight")
	body(i, nil)
	ADDQ(U8(8), i)
	CMPQ(i, whole)
	JLT(LabelRef(name + "_eight"))
	Label(name + "_rest")
	rest := GP64()
	MOVQ(n, rest)
	SUBQ(i, rest)
	JEQ(LabelRef(name + "_end"))
	body(i, s.mask(rest, tables))
	Label(name + "_end")
}

// mask chooses the first rest rows, 0 < rest < 8; rest is destroyed.
func (s isa) mask(rest Register, tables maskTables) *mask {
	if s.parts == 1 {
		bits, shift, k := GP64(), rest, K()
		MOVQ(U32(1), bits)
		SHLXQ(shift, bits, bits)
		DECQ(bits)
		KMOVW(bits.As32(), k)
		return &mask{k: k}
	}
	wide, narrow := GP64(), GP64()
	NEGQ(rest)
	LEAQ(tables.wide.Offset(64), wide)
	LEAQ(tables.narrow.Offset(32), narrow)
	return &mask{
		wide:    Mem{Base: wide, Index: rest, Scale: 8},
		narrow4: Mem{Base: narrow, Index: rest, Scale: 4},
	}
}

// load returns eight elements as float64; rows beyond a mask are zero.
func (s isa) load(e element, base, at Register, m *mask) eight {
	v := s.eight()
	for p, r := range v {
		from := Mem{Base: base, Index: at, Scale: uint8(e.size), Disp: p * 4 * e.size}
		switch {
		case m == nil && e.size == 8:
			VMOVUPD(from, r)
		case m == nil:
			VCVTPS2PD(from, r)
		case s.parts == 1 && e.size == 8:
			VMOVUPD_Z(from, m.k, r)
		case s.parts == 1:
			VCVTPS2PD_Z(from, m.k, r)
		case e.size == 8:
			VMOVUPD(m.wide.Offset(32*p), r)
			VMASKMOVPD(from, r, r)
		default:
			x := r.AsX()
			VMOVUPS(m.narrow4.Offset(16*p), x)
			VMASKMOVPS(from, x, x)
			VCVTPS2PD(x, r)
		}
	}
	return v
}

// store rounds eight lanes to e, writes those the mask chooses, and leaves the
// rounded values in v when back is set.
func (s isa) store(e element, v eight, base, at Register, m *mask, back bool) {
	for p, r := range v {
		to := Mem{Base: base, Index: at, Scale: uint8(e.size), Disp: p * 4 * e.size}
		switch {
		case e.size == 8 && m == nil:
			VMOVUPD(r, to)
		case e.size == 8 && s.parts == 1:
			VMOVUPD(r, m.k, to)
		case e.size == 8:
			k := YMM()
			VMOVUPD(m.wide.Offset(32*p), k)
			VMASKMOVPD(r, k, to)
		case s.parts == 1:
			y := YMM()
			VCVTPD2PS(r, y)
			if m == nil {
				VMOVUPS(y, to)
			} else {
				z := ZMM() // a masked 512-bit store, so that AVX512VL is not needed
				VMOVAPS(y, z.AsY())
				VMOVUPS(z, m.k, to)
			}
			if back {
				VCVTPS2PD(y, r)
			}
		default:
			x := XMM()
			VCVTPD2PSY(r, x)
			if m == nil {
				VMOVUPS(x, to)
			} else {
				k := XMM()
				VMOVUPS(m.narrow4.Offset(16*p), k)
				VMASKMOVPS(x, k, to)
			}
			if back {
				VCVTPS2PD(x, r)
			}
		}
	}
}

// sum adds eight lanes by the tree of the twins and writes the total:
// b = a[0:4] + a[4:8], then (b₀ + b₂) + (b₁ + b₃).
func (s isa) sum(a eight, to Mem) {
	var b VecVirtual
	if s.parts == 1 {
		high := YMM()
		VEXTRACTF64X4(U8(1), a[0], high)
		b = a[0].AsY().(VecVirtual)
		VADDPD(high, b, b)
	} else {
		b = a[0]
		VADDPD(a[1], b, b)
	}
	x, high := b.AsX(), XMM()
	VEXTRACTF128(U8(1), b, high)
	VADDPD(high, x, x)
	VUNPCKHPD(x, x, high)
	VADDSD(high, x, x)
	VMOVSD(x, to)
}
