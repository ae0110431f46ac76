package stats

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// BinomialAtLeast is P(K >= k) of n trials of probability p: the regularised
// incomplete beta function I_p(k, n-k+1), DLMF 8.17.5.
func BinomialAtLeast(k, n int, p float64) float64 {
	switch {
	case k <= 0:
		return 1
	case k > n:
		return 0
	}
	return mathext.RegIncBeta(float64(k), float64(n-k+1), p)
}

// BinomialInterval is the central interval for a probability of which k in n
// were seen, at least as wide as the confidence promises: Clopper & Pearson,
// Biometrika 26 (1934) 404.
func BinomialInterval(k, n int, confidence float64) (lower, upper float64) {
	if k < 0 || k > n || !(confidence > 0 && confidence < 1) {
		panic("stats: binomial interval of impossible counts or confidence")
	}
	side := (1 - confidence) / 2
	lower, upper = 0, 1
	if k > 0 {
		lower = mathext.InvRegIncBeta(float64(k), float64(n-k+1), side)
	}
	if k < n {
		upper = mathext.InvRegIncBeta(float64(k+1), float64(n-k), 1-side)
		if k == 0 { // where the inverse above loses digits: (1-upper)^n = side
			upper = -math.Expm1(math.Log(side) / float64(n))
		}
	}
	return lower, upper
}
