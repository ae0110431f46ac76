package toys

import (
	"fmt"
	"math"

	"lumireach/stats"
)

// cautions are what a reader must know before using the numbers, each once and
// only where it applies.
func cautions(r *ReachResult, engines []*stats.Engine, p plateaus) []string {
	c := r.Config
	var out []string
	say := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }

	say("Expected, not observed: half of all experiments do worse than the median.")
	say("Significances are local: no correction for a search at many masses.")

	smallest, at := math.Inf(1), 0.0
	for _, point := range r.Points {
		if point.SmallestCount < smallest {
			smallest, at = point.SmallestCount, point.Luminosity
		}
	}
	if smallest < 10 {
		say("The asymptotic formulas assume many events; the smallest expected count of a bin with signal is %.2g, at luminosity %.4g.", smallest, at)
	}
	below := false
	for i, point := range r.Points {
		signal, background := 0.0, 0.0
		for _, l := range engines[i].Point(1, nil).Lambda {
			signal += l
		}
		for _, l := range engines[i].Point(0, nil).Lambda {
			background += l
		}
		if point.Formula.Exclusion.MuUp.Minus2*(signal-background) < -math.Log(1-c.Confidence) {
			below = true
		}
	}
	if below {
		say("Some limits of the formulas lie below %.4g signal events, where no true %v %% CLs limit without systematic uncertainties can be.", -math.Log(1-c.Confidence), 100*c.Confidence)
	}
	if p.z < 7 {
		say("At infinite luminosity the systematic uncertainties leave a median Z of %.3g.", p.z)
	}

	thrown, failed, tails := 0, 0, false
	for _, point := range r.Points {
		if point.Toys == nil {
			continue
		}
		d, x := point.Toys.Discovery, point.Toys.Exclusion
		thrown += d.Toys + d.NullToys + x.Toys
		failed += d.FailedFits + x.FailedFits
		for _, z := range []float64{d.ZAtLeast.Minus2, d.ZAtLeast.Minus1, d.ZAtLeast.Median, d.ZAtLeast.Plus1, d.ZAtLeast.Plus2} {
			tails = tails || !math.IsNaN(z)
		}
	}
	if tails {
		say("Where a significance lies beyond the tail that the toys reach, only a lower bound is given.")
	}
	if failed > 0 {
		say("%d of %d toys had a fit that failed; the errors allow for them on either side.", failed, thrown)
	}
	if float64(failed) > 1e-3*float64(thrown) {
		say("Warning: more than 1 in 1000 fits failed: the numbers could move by more than their errors if the failures are not like the rest.")
	}
	if c.Toys > 0 {
		say("The toys are thrown from the model that they are fitted with: a bias from a wrong background shape is not tested.")
	}
	say("Plan on simulation or sidebands and fix the method before looking at the signal window; the collaboration's own statistics rules come first. 5σ is a convention, and a p-value is not the probability that there is no signal.")
	return out
}
