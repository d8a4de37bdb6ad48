package matfile

import (
	"math"
	"math/bits"
)

// eiselLemire returns the float64 nearest to ±man·10^exp10, ties to even, and
// true; or false where 128 bits do not decide it, or the answer is subnormal,
// infinite or beyond the table. man must not be zero. Source: "Number Parsing
// at a Gigabyte per Second", arXiv:2101.11408.
func eiselLemire(man uint64, exp10 int, neg bool) (float64, bool) {
	if exp10 < pow10Min || exp10 > pow10Max {
		return 0, false
	}
	pow := &pow10Table[exp10-pow10Min]

	// w = man·2^shift has its top bit set; 217706/2^16 ≈ log2(10).
	shift := bits.LeadingZeros64(man)
	w := man << shift
	exp2 := (217706*exp10)>>16 + 64 + 1023 - shift

	// hi:lo = the top 128 bits of w·10^exp10.
	hi, lo := bits.Mul64(w, pow.hi)
	if hi&0x1ff == 0x1ff && lo+w < w {
		// The 64-bit power leaves the rounding open: take 128 bits.
		hi2, lo2 := bits.Mul64(w, pow.lo)
		sum, carry := bits.Add64(lo, hi2, 0)
		hi, lo = hi+carry, sum
		if hi&0x1ff == 0x1ff && lo+1 == 0 && lo2+w < w {
			return 0, false
		}
	}

	// 54 bits, then round to 53.
	top := int(hi >> 63)
	m := hi >> (top + 9)
	exp2 -= 1 - top
	if lo == 0 && hi&0x1ff == 0 && m&3 == 1 {
		return 0, false // perhaps exactly half way
	}
	m = (m + m&1) >> 1
	if m>>53 != 0 {
		m >>= 1
		exp2++
	}
	if exp2 < 1 || exp2 > 2046 {
		return 0, false
	}
	word := uint64(exp2)<<52 | m&(1<<52-1)
	if neg {
		word |= 1 << 63
	}
	return math.Float64frombits(word), true
}
