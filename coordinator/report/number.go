package report

import (
	"bytes"
	"math"
	"strconv"
	"strings"
)

// Number is a measured quantity. JSON knows neither NaN nor infinity: both are
// written as null, which means "not measured or not finite", and null is read
// back as NaN.
type Number float64

// Finite says that the number was measured and is neither NaN nor infinite.
func (n Number) Finite() bool {
	return !math.IsNaN(float64(n)) && !math.IsInf(float64(n), 0)
}

// MarshalJSON writes the shortest decimal that reads back to the same bits.
func (n Number) MarshalJSON() ([]byte, error) {
	if !n.Finite() {
		return []byte("null"), nil
	}
	return []byte(shortest(float64(n))), nil
}

// UnmarshalJSON reads a number or null.
func (n *Number) UnmarshalJSON(text []byte) error {
	if bytes.Equal(text, []byte("null")) {
		*n = Unknown()
		return nil
	}
	v, err := strconv.ParseFloat(string(text), 64)
	*n = Number(v)
	return err
}

// shortest writes v without loss: plain between 1e-4 and 1e15, else with an
// exponent without leading zeros.
func shortest(v float64) string {
	if a := math.Abs(v); v == 0 || (a >= 1e-4 && a < 1e15) {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return exponent(strconv.FormatFloat(v, 'e', -1, 64))
}

// Short writes n with the given number of significant digits for a person; "not
// known" when it was not measured or is not finite.
func (n Number) Short(digits int) string { return short(n, digits) }

// short writes v with the given number of significant digits for a person;
// "not known" when it was not measured or is not finite.
func short(v Number, digits int) string {
	if !v.Finite() {
		return "not known"
	}
	a := math.Abs(float64(v))
	if v == 0 || (a >= 1e-2 && a < 1e5) {
		return strconv.FormatFloat(float64(v), 'g', digits, 64)
	}
	return exponent(strconv.FormatFloat(float64(v), 'e', digits-1, 64))
}

// exponent rewrites "1.50e-08" as "1.5e-8" and "1e+05" as "1e5".
func exponent(text string) string {
	mantissa, power, found := strings.Cut(text, "e")
	if !found {
		return text
	}
	if strings.Contains(mantissa, ".") {
		mantissa = strings.TrimRight(strings.TrimRight(mantissa, "0"), ".")
	}
	sign := ""
	if strings.HasPrefix(power, "-") {
		sign = "-"
	}
	power = strings.TrimLeft(power, "+-0")
	if power == "" {
		power = "0"
	}
	return mantissa + "e" + sign + power
}
