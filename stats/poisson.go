package stats

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// PoissonAtLeast is P(N >= n) for N ~ Poisson(mu): the lower incomplete gamma
// ratio P(n, mu), DLMF 8.4, which keeps its digits where 1 - CDF rounds to zero:
// ten of them at small means, five at a million.
func PoissonAtLeast(n int, mu float64) float64 {
	switch {
	case n <= 0:
		return 1
	case mu == 0:
		return 0
	}
	return mathext.GammaIncReg(float64(n), mu)
}

// PoissonAtMost is P(N <= n) for N ~ Poisson(mu): the upper incomplete gamma
// ratio Q(n+1, mu), DLMF 8.4.
func PoissonAtMost(n int, mu float64) float64 {
	switch {
	case n < 0:
		return 0
	case mu == 0:
		return 1
	}
	return mathext.GammaIncRegComp(float64(n+1), mu)
}

// PoissonUpper is the one-sided upper limit on the mean of which n events were
// seen: P(N <= n) is 1 - confidence there. Garwood, Biometrika 28 (1936) 437.
func PoissonUpper(n int, confidence float64) float64 {
	mustBePossible(n, confidence)
	return mathext.GammaIncRegCompInv(float64(n+1), 1-confidence)
}

// PoissonLower is the one-sided lower limit: P(N >= n) is 1 - confidence there.
func PoissonLower(n int, confidence float64) float64 {
	mustBePossible(n, confidence)
	if n == 0 {
		return 0
	}
	return mathext.GammaIncRegInv(float64(n), 1-confidence)
}

// mustBePossible keeps out what the inverse of the gamma ratio would search for
// without end.
func mustBePossible(n int, confidence float64) {
	if n < 0 || !(confidence > 0 && confidence < 1) {
		panic("stats: Poisson limit of an impossible count or confidence")
	}
}

// PoissonInterval is the central interval at the confidence given.
func PoissonInterval(n int, confidence float64) (lower, upper float64) {
	one := (1 + confidence) / 2
	return PoissonLower(n, one), PoissonUpper(n, one)
}

// LogPoisson is the logarithm of the probability of n events of mean mu.
func LogPoisson(n int, mu float64) float64 {
	if mu == 0 {
		if n == 0 {
			return 0
		}
		return math.Inf(-1)
	}
	lg, _ := math.Lgamma(float64(n) + 1)
	return float64(n)*math.Log(mu) - mu - lg
}
