package report

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// dash stands where there is no number.
const dash = "–"

// measured prints a value with its error: the error to two significant digits,
// the value to the same decimal.
func measured(value, err float64) string {
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return dash
	}
	if !(err > 0) || math.IsInf(err, 1) {
		return plain(value, 3)
	}
	places := 1 - int(math.Floor(math.Log10(err)))
	if rounded := math.Round(err * math.Pow(10, float64(places))); rounded >= 100 {
		places-- // 0.0996 rounds to 0.100, which is 0.10 to two digits
	}
	return fixed(value, places) + " ± " + fixed(err, places)
}

// fixed prints with so many decimals, which may be negative.
func fixed(value float64, places int) string {
	if places >= 0 {
		return clean(strconv.FormatFloat(value, 'f', places, 64))
	}
	unit := math.Pow(10, float64(-places))
	return clean(strconv.FormatFloat(math.Round(value/unit)*unit, 'f', 0, 64))
}

// plain prints to so many significant digits without an exponent, where that
// stays readable.
func plain(value float64, digits int) string {
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return dash
	}
	if value == 0 {
		return "0"
	}
	rounded := strconv.FormatFloat(value, 'e', digits-1, 64) // 9.996 to three digits has the exponent of 10.0
	exponent, _ := strconv.Atoi(rounded[strings.IndexByte(rounded, 'e')+1:])
	if exponent < -5 || exponent > 6 {
		return strconv.FormatFloat(value, 'g', digits, 64)
	}
	return fixed(value, max(0, digits-1-exponent))
}

// clean writes a rounded zero without a sign.
func clean(s string) string {
	if v, err := strconv.ParseFloat(s, 64); err == nil && v == 0 && s[0] == '-' {
		return s[1:]
	}
	return s
}

// percent prints a probability.
func percent(p float64) string {
	switch {
	case math.IsNaN(p):
		return dash
	case p > 0 && p < 0.0005:
		return "< 0.1 %"
	case p < 1 && p >= 0.9995:
		return "> 99.9 %"
	}
	return fixed(100*p, 1) + " %"
}

// measuredPercent is measured for a probability, whose error is half of an
// interval: where no toy passed, or all did, only its other end is known.
func measuredPercent(p, err float64) string {
	switch {
	case math.IsNaN(p):
		return dash
	case p == 0 && err > 0:
		return "< " + plain(100*2*err, 2) + " %"
	case p == 1 && err > 0:
		places := max(1, -int(math.Floor(math.Log10(200*err))))
		unit := math.Pow(10, float64(places))
		return "> " + fixed(math.Floor(100*(1-2*err)*unit)/unit, places) + " %"
	}
	return measured(100*p, 100*err) + " %"
}

// luminosity prints a luminosity as a user would type it.
func luminosity(l float64) string { return strconv.FormatFloat(l, 'g', 6, 64) }

// atLeast prints a lower bound, rounded down.
func atLeast(z float64) string { return fmt.Sprintf("> %.1f", math.Floor(10*z)/10) }
