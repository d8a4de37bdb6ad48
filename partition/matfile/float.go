package matfile

import (
	"encoding/binary"
	"math"
	"strconv"
)

//go:generate go run ./internal/genpow10

// exactPow10 are the powers of ten that a float64 holds exactly.
var exactPow10 = [...]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

const maxDigits = 19 // 10^19 − 1 fits a uint64

// scanFloat reads a decimal number at b[p:] and returns its value, correctly
// rounded, and the position behind it. The syntax is [+-]digits[.digits] with an
// exponent after e, E, d or D; d is what Fortran programs write. ok is false where no
// number stands or its value is not finite.
//
// b must go on behind the number with at least one byte that cannot belong to
// it; a chunk ends with a line end. The answer has the bits of
// strconv.ParseFloat.
func scanFloat(b []byte, p int) (v float64, next int, ok bool) {
	start := p
	neg := false
	if c := b[p]; c == '-' || c == '+' {
		neg = c == '-'
		p++
	}
	mark, man := p, uint64(0)
	for d := b[p] - '0'; d <= 9; d = b[p] - '0' { // few, mostly: no words of eight
		man = man*10 + uint64(d)
		p++
	}
	digits, exp := p-mark, 0
	if b[p] == '.' {
		p++
		mark = p
		man, p = scanDigits(b, p, man)
		exp = mark - p
		digits += p - mark
	}
	if digits == 0 {
		return 0, p, false
	}
	if c := b[p] | 0x20; c == 'e' || c == 'd' {
		e, q, good := scanExponent(b, p+1)
		if !good {
			return 0, q, false
		}
		exp, p = exp+e, q
	}
	if digits > maxDigits {
		v, ok = longDecimal(b, start, p)
		return v, p, ok
	}
	if man < 1<<53 && exp >= -22 && exp <= 22 {
		// Clinger's fast path: both operands exact, one rounding.
		v = float64(man)
		if exp < 0 {
			v /= exactPow10[-exp]
		} else {
			v *= exactPow10[exp]
		}
		if neg {
			v = -v
		}
		return v, p, true
	}
	if man == 0 {
		return math.Copysign(0, sign(neg)), p, true
	}
	if v, ok = eiselLemire(man, exp, neg); ok {
		return v, p, true
	}
	v, ok = slowFloat(b[start:p])
	return v, p, ok
}

// scanDigits reads decimal digits behind those already in man, which wraps
// around silently beyond 19 of them.
func scanDigits(b []byte, p int, man uint64) (uint64, int) {
	for p+8 <= len(b) {
		w := binary.LittleEndian.Uint64(b[p:])
		if !eightDigits(w) {
			break
		}
		man = man*1e8 + eightDigitValue(w)
		p += 8
	}
	for p < len(b) {
		d := b[p] - '0'
		if d > 9 {
			break
		}
		man = man*10 + uint64(d)
		p++
	}
	return man, p
}

// eightDigits tells whether all eight bytes of w are decimal digits.
func eightDigits(w uint64) bool {
	return (w&0xf0f0f0f0f0f0f0f0)|((w+0x0606060606060606)&0xf0f0f0f0f0f0f0f0)>>4 == 0x3333333333333333
}

// eightDigitValue converts eight digits, the first in the lowest byte: pairs,
// then fours, then the eight, by multiplications.
func eightDigitValue(w uint64) uint64 {
	w -= 0x3030303030303030
	w = w*10 + w>>8
	return ((w&0x000000ff000000ff)*(100+1000000<<32) + (w>>16&0x000000ff000000ff)*(1+10000<<32)) >> 32
}

// scanExponent reads the signed digits behind an exponent letter; values are
// held at ±100000, far beyond the range of a float64.
func scanExponent(b []byte, p int) (exp, next int, ok bool) {
	neg := false
	if c := b[p]; c == '-' || c == '+' {
		neg = c == '-'
		p++
	}
	mark := p
	for b[p]-'0' <= 9 {
		exp = min(exp*10+int(b[p]-'0'), 100000)
		p++
	}
	if neg {
		exp = -exp
	}
	return exp, p, p > mark
}

// longDecimal converts the number b[start:end] of more than 19 digits: where
// its first 19 significant ones and their successor round to the same float64,
// the rest cannot matter.
func longDecimal(b []byte, start, end int) (float64, bool) {
	var man uint64
	kept, exp, p := 0, 0, start
	neg, point, cut := b[start] == '-', false, false
	for ; p < end && b[p] <= '9'; p++ {
		switch c := b[p]; {
		case c == '.':
			point = true
			continue
		case c == '-' || c == '+':
			continue
		case kept == 0 && c == '0':
		case kept < maxDigits:
			man, kept = man*10+uint64(c-'0'), kept+1
		default:
			cut = cut || c != '0'
			exp++
		}
		if point {
			exp--
		}
	}
	if p < end {
		e, _, _ := scanExponent(b, p+1)
		exp += e
	}
	if man == 0 {
		return math.Copysign(0, sign(neg)), true
	}
	v, ok := eiselLemire(man, exp, neg)
	if ok && cut {
		up, okUp := eiselLemire(man+1, exp, neg)
		ok = okUp && up == v
	}
	if ok {
		return v, true
	}
	return slowFloat(b[start:end])
}

// slowFloat leaves the rare cases to strconv, with a Fortran d turned to e.
func slowFloat(text []byte) (float64, bool) {
	own := []byte(string(text))
	for i, c := range own {
		if c == 'd' || c == 'D' {
			own[i] = 'e'
		}
	}
	v, err := strconv.ParseFloat(string(own), 64)
	return v, err == nil
}

func sign(neg bool) float64 {
	if neg {
		return -1
	}
	return 1
}
