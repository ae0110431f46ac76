package toys

import (
	"fmt"
	"math"

	"lumireach/stats"
)

// list collects cautions.
type list []string

func (l *list) say(format string, args ...any) { *l = append(*l, fmt.Sprintf(format, args...)) }

// cautions are what a reader must know before using the numbers of a reach, each
// once and only where it applies.
func cautions(r *ReachResult, engines []*stats.Engine, p plateaus) []string {
	var out list
	out.say("Expected, not observed: half of all experiments do worse than the median.")
	out.say("Significances are local: nothing corrects for a search at many masses.")
	smallest, at := math.Inf(1), 0.0
	formulas := make([]Exclusion, len(r.Points))
	thrown, failed, tails := 0, 0, false
	for i, point := range r.Points {
		formulas[i] = point.Formula.Exclusion
		if point.SmallestCount < smallest {
			smallest, at = point.SmallestCount, point.Luminosity
		}
		if point.Toys == nil {
			continue
		}
		d, x := point.Toys.Discovery, point.Toys.Exclusion
		thrown += d.Toys + d.NullToys + x.Toys
		failed += d.FailedFits + x.FailedFits
		for _, z := range d.ZAtLeast.list() {
			tails = tails || !math.IsNaN(z)
		}
	}
	for _, g := range r.Goals {
		if g.Toys != nil {
			thrown += g.Toys.Toys
			failed += g.Toys.FailedFits
		}
	}
	out.fewEvents(smallest, at)
	out.impossibleLimits(r.Config, formulas, engines)
	if p.z < 7 {
		out.say("At infinite luminosity the systematic uncertainties leave a median Z of %.3g.", p.z)
	}
	if tails {
		out.say("Where a significance lies beyond the tail that the toys are trusted with, only a lower bound is given.")
	}
	out.simulation(engines)
	out.floating(engines)
	out.indistinct(r)
	out.failures(failed, thrown)
	for _, c := range r.Checks {
		if math.Abs(c.Pull) > suspicious {
			out.say("Warning: %d of %d plain background-only toys reach q0 of %v, where the weighted ones expect %.1f: do not trust the tails.", c.Passing, c.Plain, c.Z*c.Z, c.Expected)
		}
	}
	if r.Config.Toys > 0 {
		out.say("Tails are estimated by weighted toys; the effective sample size stands beside each in the JSON.")
	}
	out.always(r.Config)
	return out
}

// bandsCautions are those of limits alone.
func bandsCautions(r *BandsResult, engines []*stats.Engine) []string {
	var out list
	out.say("Expected, not observed: half of all experiments set a weaker limit than the median.")
	smallest, at := math.Inf(1), 0.0
	formulas := make([]Exclusion, len(r.Points))
	thrown, failed := 0, 0
	for i, p := range r.Points {
		formulas[i] = p.Formula
		if n := engines[i].SmallestCount(1); n < smallest {
			smallest, at = n, p.Luminosity
		}
		if p.Toys != nil {
			thrown += p.Toys.Toys
			failed += p.Toys.FailedFits
		}
	}
	out.fewEvents(smallest, at)
	out.impossibleLimits(r.Config, formulas, engines)
	out.simulation(engines)
	out.floating(engines)
	out.failures(failed, thrown)
	out.always(r.Config)
	return out
}

// crosscheckCautions are those of a cross-check.
func crosscheckCautions(r *CrosscheckResult, engines []*stats.Engine, p plateaus) []string {
	var out list
	out.say("A verdict holds for the luminosities and significances that were tested, and for this scenario alone.")
	out.say("Significances are local: nothing corrects for a search at many masses.")
	if p.z < 7 {
		out.say("At infinite luminosity the systematic uncertainties leave a median Z of %.3g.", p.z)
	}
	out.simulation(engines)
	out.always(r.Config)
	return out
}

func (l *list) fewEvents(smallest, luminosity float64) {
	const few = 10 // common practice, no source
	if smallest < few {
		l.say("The asymptotic formulas assume many events; the smallest expected count of a bin that the signal reaches is %.2g, at luminosity %.4g.", smallest, luminosity)
	}
}

// impossibleLimits names limits of the formulas below -ln(1-confidence) events,
// the limit of an experiment that sees nothing.
func (l *list) impossibleLimits(c Config, formulas []Exclusion, engines []*stats.Engine) {
	least := -math.Log(1 - c.Confidence)
	for i, x := range formulas {
		if x.MuUp.Minus2*signalEvents(engines[i]) < least {
			l.say("Some limits of the formulas lie below %.4g signal events: without systematic uncertainties no true %v %% CLs limit can.", least, 100*c.Confidence)
			return
		}
	}
}

// simulation tells of an uncertainty that no luminosity removes.
func (l *list) simulation(engines []*stats.Engine) {
	if engines[0].Factors() > 0 {
		l.say("The statistical errors of simulated templates do not shrink with luminosity, only with more simulated events.")
	}
}

// floating tells of parameters that exist only under the signal hypothesis.
func (l *list) floating(engines []*stats.Engine) {
	const matters = 0.1 // shape widths that a standard deviation moves
	for _, p := range engines[0].Floating() {
		if p.Strength >= matters {
			l.say("The position or width of a signal is uncertain: without signal nothing holds it, and the formulas understate p-values (Davies 1987).")
			return
		}
	}
}

// indistinct tells of a signal that looks like a background that floats.
func (l *list) indistinct(r *ReachResult) {
	const nothing = 1e-4 // standard deviations
	for _, p := range r.Points {
		if !(p.Formula.Discovery.Z.Median < nothing) {
			return
		}
	}
	l.say("The data cannot tell the signal from a background whose rate is free: give that background a control region, a constraint or another shape.")
}

// signalEvents are expected at μ = 1 in all channels.
func signalEvents(e *stats.Engine) float64 {
	signal, background := e.Point(1, nil).Lambda, e.Point(0, nil).Lambda
	events := 0.0
	for bin, n := range signal {
		events += n - background[bin]
	}
	return events
}

func (l *list) failures(failed, thrown int) {
	if failed == 0 {
		return
	}
	l.say("%d of %d toys had a fit that failed; the errors allow for them on either side.", failed, thrown)
	if float64(failed) > 1e-3*float64(thrown) {
		l.say("Warning: more than 1 in 1000 fits failed; if the failures are unlike the rest, the numbers could move by more than their errors.")
	}
}

func (l *list) always(c Config) {
	if c.Toys > 0 {
		l.say("Toys are thrown from the model that they are fitted with: a bias from a wrong background shape is not tested.")
	}
	l.say("Plan on simulation or sidebands and fix the method before looking at the signal window. The collaboration's own statistics rules come first; 5σ is a convention, and a p-value is not the probability that there is no signal.")
}
