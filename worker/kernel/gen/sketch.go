package main

import (
	. "github.com/mmcloughlin/avo/build"
	. "github.com/mmcloughlin/avo/operand"
	. "github.com/mmcloughlin/avo/reg"
)

// Bytes in sketch's plan of a call, [28]uint64: what stays the same in it,
// but for the counters.
const (
	planCounter = 0   // sixteen: 64·G + t of the hashes to come
	planSegment = 128 // eight: byte at which their segment begins
	planStep    = 192 // counters advance by this every sixteen hashes
	planSeed    = 200
	planPlaces  = 208
	planScale   = 216 // 1/√zeta as float64
)

// batch is the number of hashes that are drawn before they are applied: enough
// to hide the switch between the two loops, few enough for the first cache.
const batch = 128

const (
	golden = 0x9E3779B97F4A7C15
	mul1   = 0xBF58476D1CE4E5B9
	mul2   = 0x94D049BB133111EB
)

// sketchGroups writes sketch's addGroups for groups of eight lanes with zeta 4
// or 8. Hashes come sixteen at a time as vectors and wait in two arrays on the
// stack: h itself, and the byte in dst at which its eight sketch rows begin.
func sketchGroups() {
	addGroups("addGroupsAVX512", drawAVX512, applyAVX512)
	addGroups("addGroupsAVX2", drawAVX2, applyAVX2)
}

// frame is what the two loops of one routine share.
type frame struct {
	plan       Register // *[28]uint64
	dst, w     Register
	words, ats Mem // h and byte offsets, batch of each
}

// addGroups writes func(dst, w *float64, groups, zeta int, plan *[28]uint64). draw
// fills sixteen hashes at a byte offset and returns nothing; apply sets up its
// constants and returns the body for one group, four hashes at a time.
func addGroups(name string, draw func(f frame) func(at Register), apply func(f frame) (load func(), four func(at Register))) {
	TEXT(name, 0, "func(dst, w *float64, groups, zeta int, plan *[28]uint64)")
	Pragma("noescape")
	Doc(name + " adds groups of 8 rows of w; zeta is 4 or 8 and groups not zero.")
	f := frame{
		dst: Load(Param("dst"), GP64()), w: Load(Param("w"), GP64()), plan: Load(Param("plan"), GP64()),
		words: AllocLocal(batch*8 + 8), ats: AllocLocal(batch * 8),
	}
	left := Load(Param("groups"), GP64()) // hashes still to come
	zetaBytes := Load(Param("zeta"), GP64())
	IMULQ(zetaBytes, left)
	SHLQ(U8(3), zetaBytes)
	drawSome := draw(f)
	loadGroup, addFour := apply(f)

	Label(name + "_batch")
	end, at := GP64(), GP64() // in bytes of the arrays
	MOVQ(U32(batch), end)
	CMPQ(left, end)
	CMOVQLT(left, end)
	SUBQ(end, left)
	SHLQ(U8(3), end)

	XORQ(at, at)
	Label(name + "_draw")
	drawSome(at)
	ADDQ(U32(128), at)
	CMPQ(at, end)
	JLT(LabelRef(name + "_draw"))

	XORQ(at, at)
	Label(name + "_group")
	loadGroup()
	ADDQ(U8(64), f.w)
	stop := GP64()
	LEAQ(Mem{Base: at, Index: zetaBytes, Scale: 1}, stop)
	Label(name + "_four")
	addFour(at)
	ADDQ(U8(32), at)
	CMPQ(at, stop)
	JLT(LabelRef(name + "_four"))
	CMPQ(at, end)
	JLT(LabelRef(name + "_group"))

	TESTQ(left, left)
	JNE(LabelRef(name + "_batch"))
	VZEROUPPER()
	RET()
}

// at is the element of a stack array at a byte offset.
func at(array Mem, offset Register, disp int) Mem {
	m := array.Offset(disp)
	m.Index, m.Scale = offset, 1
	return m
}

// constant broadcasts a 64-bit constant.
func constant(value uint64, v VecVirtual) VecVirtual {
	g, x := GP64(), XMM()
	MOVQ(U64(value), g)
	VMOVQ(g, x)
	VPBROADCASTQ(x, v)
	return v
}

// broadcast spreads a field of the plan.
func (f frame) broadcast(offset int, v VecVirtual) VecVirtual {
	VPBROADCASTQ(Mem{Base: f.plan, Disp: offset}, v)
	return v
}

func drawAVX512(f frame) func(Register) {
	gold, m1, m2 := constant(golden, ZMM()), constant(mul1, ZMM()), constant(mul2, ZMM())
	seed, places := f.broadcast(planSeed, ZMM()), f.broadcast(planPlaces, ZMM())
	step, segment := f.broadcast(planStep, ZMM()), ZMM()
	counters := [2]VecVirtual{ZMM(), ZMM()}
	VMOVDQU64(Mem{Base: f.plan, Disp: planCounter}, counters[0])
	VMOVDQU64(Mem{Base: f.plan, Disp: planCounter + 64}, counters[1])
	VMOVDQU64(Mem{Base: f.plan, Disp: planSegment}, segment)
	return func(i Register) {
		for part, counter := range counters {
			z, t := ZMM(), ZMM()
			fold := func(bits int) {
				VPSRLQ(U8(bits), z, t)
				VPXORQ(t, z, z)
			}
			mix := func(from VecVirtual) {
				VPADDQ(from, gold, z)
				fold(30)
				VPMULLQ(m1, z, z)
				fold(27)
				VPMULLQ(m2, z, z)
				fold(31)
			}
			mix(counter)
			VPXORQ(seed, z, z)
			mix(z)
			VPADDQ(step, counter, counter)
			VMOVDQU64(z, at(f.words, i, 64*part))
			// Byte offset: 64·⌊(h>>32)·places/2³²⌋ within the segment.
			VPSRLQ(U8(32), z, z)
			VPMULUDQ(places, z, z)
			VPSRLQ(U8(32), z, z)
			VPSLLQ(U8(6), z, z)
			VPADDQ(segment, z, z)
			VMOVDQU64(z, at(f.ats, i, 64*part))
		}
	}
}

// applyAVX512 takes a group as one register. Lane m of the sketch rows takes
// lane m xor r of the group, so the permutation is iota xor h>>8, of which the
// instruction reads three bits; h>>8 is h read one byte further on.
func applyAVX512(f frame) (load func(), four func(Register)) {
	iota := GLOBL("lanes512", RODATA|NOPTR)
	for l := range 8 {
		DATA(8*l, U64(l))
	}
	lanes, sign, scale := ZMM(), constant(1<<63, ZMM()), ZMM()
	VMOVDQU64(iota, lanes)
	VBROADCASTSD(Mem{Base: f.plan, Disp: planScale}, scale)
	v, minus := ZMM(), ZMM()
	load = func() {
		VMULPD(Mem{Base: f.w}, scale, v)
		VPXORQ(sign, v, minus)
	}
	four = func(i Register) {
		for t := range 4 {
			k, turn, x, place := K(), ZMM(), ZMM(), GP64()
			MOVQ(at(f.ats, i, 8*t), place)
			KMOVB(at(f.words, i, 8*t), k)
			VPXORQ_BCST(at(f.words, i, 8*t+1), lanes, turn)
			VBLENDMPD(minus, v, k, x)
			VPERMPD(x, turn, x)
			row := Mem{Base: f.dst, Index: place, Scale: 1}
			VADDPD(row, x, x)
			VMOVUPD(x, row)
		}
	}
	return load, four
}

// drawAVX2 has four chains of dependent instructions side by side, so that they
// hide each other's latency; constants and counters stay in memory.
func drawAVX2(f frame) func(Register) {
	gold := quads("golden256", golden)
	m1, m1High := quads("mul1", mul1), quads("mul1high", mul1>>32)
	m2, m2High := quads("mul2", mul2), quads("mul2high", mul2>>32)
	return func(i Register) {
		var z, t, u [4]VecVirtual
		for c := range z {
			z[c], t[c], u[c] = YMM(), YMM(), YMM()
		}
		each := func(do func(z, t, u VecVirtual, c int)) {
			for c := range z {
				do(z[c], t[c], u[c], c)
			}
		}
		fold := func(bits int) {
			each(func(z, t, _ VecVirtual, _ int) { VPSRLQ(U8(bits), z, t) })
			each(func(z, t, _ VecVirtual, _ int) { VPXOR(t, z, z) })
		}
		// z·m modulo 2⁶⁴ from three 32-bit products.
		times := func(m, high Mem) {
			each(func(z, t, _ VecVirtual, _ int) { VPSRLQ(U8(32), z, t) })
			each(func(z, _, u VecVirtual, _ int) { VPMULUDQ(high, z, u) })
			each(func(_, t, _ VecVirtual, _ int) { VPMULUDQ(m, t, t) })
			each(func(z, _, _ VecVirtual, _ int) { VPMULUDQ(m, z, z) })
			each(func(_, t, u VecVirtual, _ int) { VPADDQ(u, t, t) })
			each(func(_, t, _ VecVirtual, _ int) { VPSLLQ(U8(32), t, t) })
			each(func(z, t, _ VecVirtual, _ int) { VPADDQ(t, z, z) })
		}
		mix := func() {
			each(func(z, _, _ VecVirtual, _ int) { VPADDQ(gold, z, z) })
			fold(30)
			times(m1, m1High)
			fold(27)
			times(m2, m2High)
			fold(31)
		}
		shared := f.broadcast(planStep, YMM())
		each(func(z, t, _ VecVirtual, c int) {
			counter := Mem{Base: f.plan, Disp: planCounter + 32*c}
			VMOVDQU(counter, z)
			VPADDQ(shared, z, t)
			VMOVDQU(t, counter)
		})
		mix()
		f.broadcast(planSeed, shared)
		each(func(z, _, _ VecVirtual, _ int) { VPXOR(shared, z, z) })
		mix()
		f.broadcast(planPlaces, shared)
		each(func(z, _, _ VecVirtual, c int) {
			VMOVDQU(z, at(f.words, i, 32*c))
			VPSRLQ(U8(32), z, z)
			VPMULUDQ(shared, z, z)
			VPSRLQ(U8(32), z, z)
			VPSLLQ(U8(6), z, z)
			VPADDQ(Mem{Base: f.plan, Disp: planSegment + 32*(c%2)}, z, z)
			VMOVDQU(z, at(f.ats, i, 32*c))
		})
	}
}

// quads is a constant of four equal quadwords in memory.
func quads(name string, value uint64) Mem {
	m := GLOBL(name, RODATA|NOPTR)
	for i := range 4 {
		DATA(8*i, U64(value))
	}
	return m
}

// applyAVX2 takes a group as two halves. The low two bits of r permute within a
// half, the third swaps the halves, which is done by address.
func applyAVX2(f frame) (load func(), four func(Register)) {
	signs := GLOBL("signs256", RODATA|NOPTR) // four bits to four signs
	for bits := range 16 {
		for l := range 4 {
			DATA(32*bits+8*l, U64(uint64(bits>>l&1)<<63))
		}
	}
	turns := GLOBL("turns256", RODATA|NOPTR) // lanes m xor r as pairs of floats
	for r := range 4 {
		for m := range 4 {
			DATA(32*r+8*m, U32(2*(m^r)))
			DATA(32*r+8*m+4, U32(2*(m^r)+1))
		}
	}
	turnTable, signTable := Mem{Base: GP64(), Scale: 1}, Mem{Base: GP64(), Scale: 1}
	LEAQ(turns, turnTable.Base)
	LEAQ(signs, signTable.Base)
	v := [2]VecVirtual{YMM(), YMM()}
	load = func() {
		scale := YMM()
		VBROADCASTSD(Mem{Base: f.plan, Disp: planScale}, scale)
		for half := range v {
			VMULPD(Mem{Base: f.w, Disp: 32 * half}, scale, v[half])
		}
	}
	four = func(i Register) {
		for t := range 4 {
			r, place, turn := GP64(), GP64(), YMM()
			bits := [2]Register{GP64(), GP64()}
			MOVBQZX(at(f.words, i, 8*t+1), r)
			MOVBQZX(at(f.words, i, 8*t), bits[0])
			MOVQ(r, place)
			ANDQ(U8(3), r)
			SHLQ(U8(5), r)
			ANDQ(U8(4), place)
			SHLQ(U8(3), place)
			ADDQ(at(f.ats, i, 8*t), place)
			MOVQ(bits[0], bits[1])
			ANDQ(U8(15), bits[0])
			SHLQ(U8(5), bits[0])
			SHRQ(U8(4), bits[1])
			SHLQ(U8(5), bits[1])
			turnTable.Index = r
			VMOVDQU(turnTable, turn)
			for half := range v {
				x := YMM()
				signTable.Index = bits[half]
				VXORPD(signTable, v[half], x)
				VPERMPS(x, turn, x)
				row := Mem{Base: f.dst, Index: place, Scale: 1}
				VADDPD(row, x, x)
				VMOVUPD(x, row)
				if half == 0 {
					XORQ(U8(32), place)
				}
			}
		}
	}
	return load, four
}
