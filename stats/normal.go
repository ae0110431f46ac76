package stats

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// PValue is the one-sided tail P(X >= z) of the standard normal distribution
// (DLMF 7.17), by the complementary error function, so that small tails keep
// their digits: good to z = 37.5, beyond which the result is no normal double.
func PValue(z float64) float64 { return 0.5 * math.Erfc(z/math.Sqrt2) }

// Significance is the inverse of PValue: the z of a one-sided p. It is -Inf at
// p = 1, +Inf at p = 0 and NaN outside [0, 1].
func Significance(p float64) float64 {
	switch {
	case !(p >= 0 && p <= 1):
		return math.NaN()
	case p == 0:
		return math.Inf(1)
	case p == 1:
		return math.Inf(-1)
	case p == 0.5:
		return 0
	}
	return -mathext.NormalQuantile(p)
}

// Phi is the cumulative distribution P(X <= x) of the standard normal.
func Phi(x float64) float64 { return PValue(-x) }

// PhiInverse is the inverse of Phi: the normal quantile at u. Below ½ it has the
// digits of u; above, those of 1-u.
func PhiInverse(u float64) float64 {
	z := Significance(u)
	if z == 0 {
		return 0
	}
	return -z
}
