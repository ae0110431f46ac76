package stats

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Asimov is the experiment in which every count and auxiliary measurement is at
// its expectation. Cowan, Cranmer, Gross, Vitells, Eur. Phys. J. C71 (2011)
// 1554, section 3.2 (CCGV below).
func (p Point) Asimov() *Data {
	return &Data{N: slices.Clone(p.Lambda), A: slices.Clone(p.A), M: slices.Clone(p.M)}
}

// MedianZ is the median discovery significance at signal strength mu by the
// asymptotic formula sqrt(q0) of the Asimov experiment, CCGV Eq. (62). Chances
// and bands follow from q0's distribution: Z is normal about it with unit
// width, CCGV section 4.2.
func (e *Engine) MedianZ(mu float64) (float64, error) {
	if e.Bare() > 0 && mu > 0 {
		return math.NaN(), ErrOneEvent
	}
	d := e.Point(mu, nil).Asimov()
	for i, background := range e.Point(0, nil).Lambda {
		if background == 0 {
			d.N[i] = 0 // what is expected there is negligible, or Bare would tell
		}
	}
	fit := e.Fitter().AtFresh(d, 0)
	if err := fit.Status.Err(); err != nil {
		return math.NaN(), fmt.Errorf("background-only fit of the expected data: %w", err)
	}
	// The free fit of Asimov data is the truth, with deviance 0.
	return math.Sqrt(fit.Deviance), nil
}

// ErrOneEvent tells that no significance exists: signal can fall where no
// background can, and one event there decides.
var ErrOneEvent = errors.New("signal can fall where no background can: one event there decides")

// exclusionZ is sqrt(q̃_μ) of the Asimov experiment without signal.
func exclusionZ(f *Fitter, background *Data, mu float64) (float64, error) {
	fit := f.At(background, mu)
	if err := fit.Status.Err(); err != nil {
		return math.NaN(), fmt.Errorf("fit of the expected background at μ = %v: %w", mu, err)
	}
	return math.Sqrt(fit.Deviance), nil
}

// AsimovQTilde is q̃_μ of the Asimov experiment without signal, NaN where its fit
// fails.
func (e *Engine) AsimovQTilde(mu float64) float64 {
	f := e.Fitter()
	background := e.Point(0, nil).Asimov()
	f.start(background, mu)
	z, err := exclusionZ(f, background, mu)
	if err != nil {
		return math.NaN()
	}
	return z * z
}

// limitZ is what sqrt(q̃_μ) of the Asimov experiment is at the n-sigma expected
// CLs limit: n + Φ⁻¹(1 - αΦ(n)), from the distributions of q̃_μ of CCGV
// section 3.7 and CLs = p_{s+b}/(1 - p_b) (Read, J. Phys. G 28 (2002) 2693).
func limitZ(n, confidence float64) float64 {
	return n + Significance((1-confidence)*Phi(n))
}

// ExpectedLimit is the upper limit on μ by CLs at the confidence level that
// experiments without signal reach at the n-sigma quantile, by the asymptotic
// formulas. It uses q̃ at the limit itself, not a parabola.
func (e *Engine) ExpectedLimit(n, confidence float64) (float64, error) {
	background := e.Point(0, nil).Asimov()
	f := e.Fitter()
	f.start(background, 0)
	goal := limitZ(n, confidence)
	var failure error
	excess := func(logMu float64) float64 {
		z, err := exclusionZ(f, background, math.Exp(logMu))
		if err != nil {
			failure = err
		}
		return z - goal
	}
	low, high := 0.0, 0.0
	for excess(low) > 0 && low > -60 {
		high = low
		low--
	}
	for excess(high) < 0 && high < 60 {
		low = high
		high++
	}
	if failure != nil {
		return math.NaN(), failure
	}
	logMu, err := Root(excess, low, high, 1e-10)
	if failure != nil {
		return math.NaN(), failure
	}
	if err != nil {
		return math.NaN(), fmt.Errorf("no signal strength below %.3g is excluded", math.Exp(high))
	}
	return math.Exp(logMu), nil
}

// ExclusionN is the quantile, in standard deviations, of the experiments without
// signal that expect to exclude μ = 1: their n-sigma limit is 1. It rises with
// luminosity; half of all experiments exclude where it is zero.
func (e *Engine) ExclusionN(confidence float64) (float64, error) {
	background := e.Point(0, nil).Asimov()
	f := e.Fitter()
	f.start(background, 1)
	z, err := exclusionZ(f, background, 1)
	if err != nil {
		return math.NaN(), err
	}
	const farthest = 36 // Φ beyond it is no double
	if z > limitZ(farthest, confidence) {
		return farthest, nil
	}
	if z < limitZ(-farthest, confidence) {
		return -farthest, nil
	}
	return Root(func(n float64) float64 { return limitZ(n, confidence) - z }, -farthest, farthest, 1e-11)
}
