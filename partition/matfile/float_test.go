package matfile

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// sameAsStrconv fails the test unless scanFloat has the bits of strconv on text.
func sameAsStrconv(t interface{ Fatalf(string, ...any) }, text string) {
	want, err := strconv.ParseFloat(text, 64)
	got, next, ok := scanFloat([]byte(text+"\n"), 0)
	if ok != (err == nil) {
		t.Fatalf("scanFloat(%q) ok = %v, strconv says %v", text, ok, err)
	}
	if ok && (math.Float64bits(got) != math.Float64bits(want) || next != len(text)) {
		t.Fatalf("scanFloat(%q) = %x to byte %d, want %x to %d", text, math.Float64bits(got), next, math.Float64bits(want), len(text))
	}
}

func TestScanFloatHardCases(t *testing.T) {
	for _, text := range []string{
		"0", "-0", "0.0", "-0e5", "0e999", "1", "-1", "+1", "1.", ".5", "-.5e-3", "00001.5", "1e22", "1e23", "-1e23", "9007199254740993",
		"9007199254740992.5", "9007199254740991e22", "1.7976931348623157e308", "1.7976931348623158e308", "1.7976931348623159e308",
		"1e308", "1e309", "-1e400", "1e99999999999", "2.2250738585072011e-308", "2.2250738585072014e-308", "4.9e-324", "5e-324", "2.4e-324", "2.5e-324",
		"2.4703282292062327e-324", "2.4703282292062328e-324", "1e-400", "6.631236871469758276785396630275967e-316",
		"0.000000000000000000000000000000123456789012345678901234567890", "1" + strings.Repeat("0", 300),
		"123456789012345678901234567890", "0." + strings.Repeat("0", 400) + "1e400", strings.Repeat("9", 400) + "e-380",
		"179769313486231580793728971405303415079934132710037826936173778980444968292764750946649017977587207096330286416692887910946555547851940402630657488671505820681908902000708383676273854845817711531764475730270069855571366959622842914819860834936475292719074168444365510704342711559699508093042880",
		"8.5e22", "7.2057594037927933e16", "12345678901234567e-5", "99999999999999999999", "18446744073709551615", "18446744073709551616",
		"1.00000000000000011102230246251565404236316680908203125", "1.00000000000000011102230246251565404236316680908203124", "1.00000000000000011102230246251565404236316680908203126",
		"", "-", "+", ".", "e5", "1e", "1e+", "1e-", "--1", "-e5",
	} {
		sameAsStrconv(t, text)
	}
}

func TestScanFloatFortranExponent(t *testing.T) {
	for text, want := range map[string]float64{"1.5D+02": 150, "-2d-3": -2e-3, "1.2345678901234567890123D1": 12.345678901234567890123, "4D-324": 5e-324} {
		got, _, ok := scanFloat([]byte(text+" "), 0)
		if !ok || got != want {
			t.Errorf("scanFloat(%q) = %v, %v, want %v", text, got, ok, want)
		}
	}
}

func TestScanFloatRefusesWhatIsNoDecimal(t *testing.T) {
	for _, text := range []string{"nan", "NaN", "inf", "-Infinity", "x", "", " 1"} {
		if v, _, ok := scanFloat([]byte(text+"\n"), 0); ok {
			t.Errorf("scanFloat(%q) = %v, want refusal", text, v)
		}
	}
	if _, next, _ := scanFloat([]byte("0x1p3\n"), 0); next != 1 {
		t.Errorf("a hexadecimal number is read to byte %d, want 1", next)
	}
}

// Whatever bits a float64 has, every decimal form of it reads as strconv reads it.
func TestScanFloatProperty(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := math.Float64frombits(rapid.Uint64().Draw(t, "bits"))
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return
		}
		form := rapid.SampledFrom([]byte{'e', 'f', 'g'}).Draw(t, "form")
		sameAsStrconv(t, strconv.FormatFloat(v, form, rapid.IntRange(-1, 30).Draw(t, "digits"), 64))
	})
}

// Whatever digits and exponent are written, the bits are those of strconv.
func TestScanFloatDigitsProperty(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.StringMatching(`[+-]?[0-9]{0,25}(\.[0-9]{0,25})?([eE][+-]?[0-9]{1,3})?`).Draw(t, "text")
		sameAsStrconv(t, text)
	})
}

// Points half way between two neighbours, and one digit beside them, decide as
// strconv decides.
func TestScanFloatHalfWay(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for range 3000 {
		v := math.Float64frombits(rng.Uint64() & (1<<63 - 1))
		up := math.Nextafter(v, math.Inf(1))
		if math.IsNaN(v) || math.IsInf(up, 0) || math.Abs(math.Log10(v)) > 60 {
			v = rng.Float64() * math.Pow(10, float64(rng.IntN(120)-60))
			up = math.Nextafter(v, math.Inf(1))
		}
		mid := new(big.Float).SetPrec(2000).Add(big.NewFloat(v), big.NewFloat(up))
		mid.Quo(mid, big.NewFloat(2))
		text := mid.Text('e', 400)
		mark := strings.IndexByte(text, 'e')
		digits, exp := strings.TrimRight(text[:mark], "0"), text[mark:]
		sameAsStrconv(t, digits+exp)
		sameAsStrconv(t, digits+"00000001"+exp)
		sameAsStrconv(t, digits[:len(digits)-1]+exp)
		for _, cut := range []int{17, 18, 19, 20, 21} {
			if len(digits) > cut {
				sameAsStrconv(t, digits[:cut]+exp)
			}
		}
	}
}

// The subnormal range goes through the fallback and keeps every bit.
func TestScanFloatSubnormal(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for range 2000 {
		v := math.Float64frombits(rng.Uint64() >> 12)
		sameAsStrconv(t, strconv.FormatFloat(v, 'e', 16, 64))
		sameAsStrconv(t, strconv.FormatFloat(v, 'e', rng.IntN(25), 64))
	}
}

func BenchmarkScanFloat(b *testing.B) {
	for _, digits := range []int{5, 16} {
		b.Run(fmt.Sprintf("digits=%d", digits+1), func(b *testing.B) {
			rng := rand.New(rand.NewPCG(1, 1))
			var text []byte
			for range 10000 {
				text = strconv.AppendFloat(text, rng.NormFloat64(), 'e', digits, 64)
				text = append(text, '\n')
			}
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				for p := 0; p < len(text); p++ {
					_, p, _ = scanFloat(text, p)
				}
			}
		})
	}
}
