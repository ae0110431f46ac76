package physics

import (
	"math"
	"math/big"
	"testing"
)

// scaleByBig computes Scale without its cap to 200 bits.
func scaleByBig(measuredAt, floor, luminosity float64) float64 {
	number := func(x float64) *big.Float { return new(big.Float).SetPrec(200).SetFloat64(x) }
	square := new(big.Float).Mul(number(floor), number(floor))
	rest := new(big.Float).Sub(number(1), square)
	rest.Mul(rest, number(measuredAt)).Quo(rest, number(luminosity))
	k, _ := new(big.Float).Sqrt(rest.Add(rest, square)).Float64()
	return k
}

func TestScale(t *testing.T) {
	for _, tt := range []struct{ measuredAt, floor, luminosity float64 }{
		{5, 0.2, 5}, {5, 0.2, 20}, {5, 0.2, 1}, {5, 0, 500}, {5, 0, 0.06}, {1e-3, 0.5, 1e4}, {7, 1, 1e-9}, {7, 0.999999, 100}, {1e300, 0.3, 1e299},
	} {
		u := Uncertainty{MeasuredAt: tt.measuredAt, Floor: tt.floor}
		got, want := u.Scale(tt.luminosity), scaleByBig(tt.measuredAt, tt.floor, tt.luminosity)
		if !(math.Abs(got/want-1) < 4e-16) {
			t.Errorf("%+v: Scale is %v, want %v", tt, got, want)
		}
	}
	// 20 is four times 5: sqrt(0.04 + 0.96/4), from a pocket calculator.
	if u := (Uncertainty{MeasuredAt: 5, Floor: 0.2}); math.Abs(u.Scale(20)-0.52915026) > 1e-8 {
		t.Errorf("Scale(20) is %v, want 0.52915026", u.Scale(20))
	}
}

func TestScaleLimits(t *testing.T) {
	for _, tt := range []struct {
		name       string
		u          Uncertainty
		luminosity float64
		want       float64
	}{
		{"does not shrink", Uncertainty{}, 1e-6, 1},
		{"floor of 1", Uncertainty{MeasuredAt: 1e300, Floor: 1}, 1e-300, 1},
		{"hardly any data", Uncertainty{MeasuredAt: 5}, 5e-3, 10},
		{"overflow", Uncertainty{MeasuredAt: 1e300}, 1e-300, 10},
		{"where it was measured", Uncertainty{MeasuredAt: 3}, 3, 1},
		{"floor reached", Uncertainty{MeasuredAt: 5, Floor: 0.25}, 1e40, 0.25},
		{"down to nothing", Uncertainty{MeasuredAt: 1e-300}, 1e300, 0},
	} {
		if got := tt.u.Scale(tt.luminosity); got != tt.want {
			t.Errorf("%v: Scale is %v, want %v", tt.name, got, tt.want)
		}
	}
	u := Uncertainty{MeasuredAt: 5, Floor: 0.1}
	for l := 0.01; l < 1e6; l *= 1.3 {
		if a, b := u.Scale(l), u.Scale(1.3*l); !(b <= a) || !(b >= 0.1) || !(a <= 10) {
			t.Errorf("Scale rises from %v at %v to %v, or leaves 0.1 to 10", a, l, b)
		}
	}
}
