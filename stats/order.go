package stats

import "math"

// QuantileIndex is the place, from 0, of the smallest x with P(X <= x) >= u in
// a sorted sample of n.
func QuantileIndex(n int, u float64) int {
	if n < 1 || !(u >= 0 && u <= 1) {
		panic("stats: quantile of an empty sample or outside [0, 1]")
	}
	// A product that rounding lifts above a whole number is that number.
	rank := math.Ceil(float64(n)*u - 1e-9)
	return int(math.Max(1, rank)) - 1
}

// QuantileInterval gives the places in a sorted sample of n between which the
// u-quantile lies with at least the confidence given, whatever the distribution,
// as far as the sample reaches: the number of values below the quantile is
// binomial (David & Nagaraja, Order Statistics, section 7.1). A place past
// either end is put at the end, where the promise ends too.
func QuantileInterval(n int, u, confidence float64) (lower, upper int) {
	side := (1 - confidence) / 2
	// The largest lower with P(K <= lower) <= side, the smallest upper with
	// P(K >= upper) <= side: K values lie below the quantile.
	centre := QuantileIndex(n, u)
	step := int(4*math.Sqrt(float64(n)*u*(1-u))) + 4
	lower = lastTrue(max(0, centre-step), centre, func(r int) bool { return BinomialAtLeast(n-r, n, 1-u) <= side })
	upper = firstTrue(centre, min(n, centre+step), func(r int) bool { return BinomialAtLeast(r+1, n, u) <= side })
	return lower, min(n-1, upper)
}

// lastTrue is the last place in [low, high] where a condition that turns false
// once still holds, or low.
func lastTrue(low, high int, holds func(int) bool) int {
	for low < high {
		middle := (low + high + 1) / 2
		if holds(middle) {
			low = middle
		} else {
			high = middle - 1
		}
	}
	return low
}

// firstTrue is the first place in [low, high] where a condition that turns true
// once holds, or high.
func firstTrue(low, high int, holds func(int) bool) int {
	for low < high {
		middle := (low + high) / 2
		if holds(middle) {
			high = middle
		} else {
			low = middle + 1
		}
	}
	return low
}
