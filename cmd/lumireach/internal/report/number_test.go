package report

import (
	"math"
	"testing"
)

// The rule: the error to two significant digits, the value to the same decimal
// (common practice, no source). The rows are worked by hand.
func TestMeasured(t *testing.T) {
	for _, tt := range []struct {
		name       string
		value, err float64
		want       string
	}{
		{"plain", 2.4444, 0.0183, "2.444 ± 0.018"},
		{"error rounds up a digit, small", 1.23456, 0.0996, "1.23 ± 0.10"},
		{"error rounds up a digit, below 1", 12.3456, 0.995, "12.3 ± 1.0"},
		{"error stays below the next digit", 12.3456, 0.994, "12.35 ± 0.99"},
		{"error rounds up a digit, above 1", 123.456, 9.96, "123 ± 10"},
		{"error rounds up a digit, tens", 1234.56, 99.6, "1230 ± 100"},
		{"tens", 45.678, 12.3, "46 ± 12"},
		{"thousands", 56789, 1234, "56800 ± 1200"},
		{"power of ten, whole", 56789, 1000, "56800 ± 1000"},
		{"power of ten, fraction", 0.123456, 0.001, "0.1235 ± 0.0010"},
		{"one", 5, 1, "5.0 ± 1.0"},
		{"value below its error", 0.0004, 0.25, "0.00 ± 0.25"},
		{"zero", 0, 0.25, "0.00 ± 0.25"},
		{"negative zero", math.Copysign(0, -1), 0.25, "0.00 ± 0.25"},
		{"negative that rounds to zero", -0.001, 0.25, "0.00 ± 0.25"},
		{"negative that rounds to zero at hundreds", -12, 4321, "0 ± 4300"},
		{"negative", -1.256, 0.25, "-1.26 ± 0.25"},
		{"large", 3.21e9, 1.5e7, "3210000000 ± 15000000"},
		{"tiny", 3.21e-7, 1.5e-8, "0.000000321 ± 0.000000015"},
		{"no error", 0.123456, 0, "0.123"},
		{"no error, zero", 0, 0, "0"},
		{"no value", nan, 0.1, dash},
		{"no finite value", math.Inf(1), 0.1, dash},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if got := measured(tt.value, tt.err); got != tt.want {
				t.Errorf("measured(%v, %v) = %q, want %q", tt.value, tt.err, got, tt.want)
			}
		})
	}
}

func TestPlain(t *testing.T) {
	for _, tt := range []struct {
		name   string
		value  float64
		digits int
		want   string
	}{
		{"below one", 0.84374, 3, "0.844"},
		{"rounds up a digit, small", 0.09996, 3, "0.100"},
		{"rounds up a digit", 9.996, 3, "10.0"},
		{"rounds up to the point", 99.96, 3, "100"},
		{"a thousand", 1000, 4, "1000"},
		{"a million", 1e6, 4, "1000000"},
		{"whole digits all stand", 123456, 3, "123456"},
		{"large", 12345678, 3, "1.23e+07"},
		{"small", 0.0000123, 2, "0.000012"},
		{"tiny", 1.23e-7, 3, "1.23e-07"},
		{"zero", 0, 3, "0"},
		{"negative zero", math.Copysign(0, -1), 3, "0"},
		{"negative", -9.996, 3, "-10.0"},
		{"none", nan, 3, dash},
		{"infinite", math.Inf(-1), 3, dash},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if got := plain(tt.value, tt.digits); got != tt.want {
				t.Errorf("plain(%v, %d) = %q, want %q", tt.value, tt.digits, got, tt.want)
			}
		})
	}
}

// No chance that is neither 0 nor 1 may look like either.
func TestPercent(t *testing.T) {
	for _, tt := range []struct {
		p    float64
		want string
	}{
		{0, "0.0 %"},
		{1e-12, "< 0.1 %"},
		{0.00049, "< 0.1 %"},
		{0.0006, "0.1 %"},
		{0.50449, "50.4 %"},
		{0.99949, "99.9 %"},
		{0.9995, "> 99.9 %"},
		{1 - 1e-12, "> 99.9 %"},
		{1, "100.0 %"},
		{nan, dash},
	} {
		if got := percent(tt.p); got != tt.want {
			t.Errorf("percent(%v) = %q, want %q", tt.p, got, tt.want)
		}
	}
	for _, tt := range []struct {
		p, err float64
		want   string
	}{
		{0.0024, 0.000693, "0.240 ± 0.069 %"},
		{0.1702, 0.0053, "17.02 ± 0.53 %"},
		{0, 0.00046, "< 0.092 %"},
		{1, 0.00018, "> 99.96 %"},
		{1, 0.0046, "> 99.0 %"},
		{nan, nan, dash},
	} {
		if got := measuredPercent(tt.p, tt.err); got != tt.want {
			t.Errorf("measuredPercent(%v, %v) = %q, want %q", tt.p, tt.err, got, tt.want)
		}
	}
}

// A lower bound is never rounded up.
func TestAtLeast(t *testing.T) {
	for z, want := range map[float64]string{4.6789: "> 4.6", 4.6: "> 4.6", 0.04: "> 0.0", 5: "> 5.0"} {
		if got := atLeast(z); got != want {
			t.Errorf("atLeast(%v) = %q, want %q", z, got, want)
		}
	}
}
