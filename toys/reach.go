package toys

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"

	"lumireach/stats"
)

// Reach gives the expected discovery and exclusion reach of a search by the
// asymptotic formulas and, where toys are asked for, by pseudo-experiments.
// Cancelling ctx ends it with ctx's error.
func Reach(ctx context.Context, search stats.Search, config Config) (*ReachResult, error) {
	return precisely(ctx, config, func(r *runner) (*ReachResult, error) { return reach(r, search) })
}

// complete checks a Config and puts in what its zero values stand for.
func (c *Config) complete() error {
	if len(c.Luminosities) == 0 {
		return errors.New("no luminosity is asked for")
	}
	for _, l := range c.Luminosities {
		if !(l > 0) || math.IsInf(l, 1) {
			return fmt.Errorf("luminosity is %v, must be finite and > 0", l)
		}
	}
	if c.Toys != 0 && c.Toys < MinToys {
		return fmt.Errorf("%d toys are too few for the error of a 2σ quantile: 0 for formulas only, or at least %d", c.Toys, MinToys)
	}
	if c.Workers < 0 {
		return fmt.Errorf("workers are %d, must be >= 0", c.Workers)
	}
	if c.Workers == 0 {
		c.Workers = runtime.GOMAXPROCS(0)
	}
	if c.Mu == 0 {
		c.Mu = 1
	}
	if !(c.Mu >= LeastMu && c.Mu <= MostMu) {
		return fmt.Errorf("signal strength is %v, must be from %v to %v: scale the rates instead", c.Mu, LeastMu, MostMu)
	}
	if c.Confidence == 0 {
		c.Confidence = 0.95
	}
	if !(c.Confidence > 0.5 && c.Confidence < 1) {
		return fmt.Errorf("confidence is %v, must lie between 0.5 and 1", c.Confidence)
	}
	if c.Nuisances == "" {
		c.Nuisances = Fixed
	}
	if c.Nuisances != Fixed && c.Nuisances != Drawn {
		return fmt.Errorf("nuisances are %q, must be %q or %q", c.Nuisances, Fixed, Drawn)
	}
	return nil
}

func reach(r *runner, search stats.Search) (*ReachResult, error) {
	c := r.config
	result := &ReachResult{Config: c}
	engines := make([]*stats.Engine, len(c.Luminosities))
	for i, l := range c.Luminosities {
		e, err := search.Engine(l)
		if err != nil {
			return nil, fmt.Errorf("luminosity %v: %w", l, err)
		}
		engines[i] = e
		formula, err := formulas(e, c)
		if err != nil {
			return nil, fmt.Errorf("luminosity %v: %w", l, err)
		}
		result.Points = append(result.Points, Point{Luminosity: l, Formula: formula, SmallestCount: e.SmallestCount(c.Mu)})
	}
	goals, plateaus, err := formulaGoals(search, c)
	if err != nil {
		return nil, err
	}
	result.Goals = goals
	if enumerable(engines[0], c) {
		if err := r.exactPoints(engines, result.Points); err != nil {
			return nil, err
		}
		if err := r.exactGoals(search, result.Goals); err != nil {
			return nil, err
		}
	}

	if c.Toys > 0 {
		r.progress.Total = r.plannedGoals(result.Goals)
		for i := range result.Points {
			r.progress.Total += r.plannedLimits(engines[i], result.Points[i].Formula.Exclusion.MuUp)
			if engines[i].Bare() == 0 {
				r.progress.Total += int64(2 * c.Toys)
			}
		}
		for i := range result.Points {
			p := &result.Points[i]
			answer := &Answer{}
			r.stage(fmt.Sprintf("luminosity %.4g: discovery", p.Luminosity))
			if answer.Discovery, err = r.discover(engines[i], p.Luminosity, p.Formula.Discovery.Z); err != nil {
				return nil, err
			}
			r.stage(fmt.Sprintf("luminosity %.4g: limits", p.Luminosity))
			if answer.Exclusion, err = r.limits(engines[i], p.Luminosity, p.Formula.Exclusion.MuUp); err != nil {
				return nil, err
			}
			p.Toys = answer
		}
		if err := r.toyGoals(search, result.Goals); err != nil {
			return nil, err
		}
		for _, c := range r.checks {
			if c.Plain > 0 {
				result.Checks = append(result.Checks, c)
			}
		}
	}
	result.Cautions = cautions(result, engines, plateaus)
	return result, nil
}

// exactPoints adds the exact answers, as far as the outcomes are few enough.
func (r *runner) exactPoints(engines []*stats.Engine, points []Point) error {
	r.stage("exact sums")
	return r.share(len(points), func() func(int) {
		return func(i int) {
			a := exactly(engines[i], r.config, points[i].Formula)
			points[i].Exact = &a
		}
	})
}

// formulas is the asymptotic answer at one luminosity.
func formulas(e *stats.Engine, c Config) (Answer, error) {
	var a Answer
	z, err := e.MedianZ(c.Mu)
	switch {
	case errors.Is(err, stats.ErrOneEvent):
		a.Discovery = noDiscovery(err.Error(), -math.Expm1(-c.Mu*e.Bare()))
	case err != nil:
		return a, err
	default:
		a.Discovery = Discovery{ZAtLeast: noBand(), ChanceOne: math.NaN()}
		var zs [5]float64
		for i := range zs {
			zs[i] = math.Max(0, z+float64(i-2))
		}
		a.Discovery.Z = band(zs)
		a.Discovery.Chance3 = stats.Phi(z - 3)
		a.Discovery.Chance5 = stats.Phi(z - 5)
	}
	a.Exclusion = formulaExclusion(e, c.Confidence)
	return a, nil
}

// formulaExclusion is the asymptotic limit band at one luminosity.
func formulaExclusion(e *stats.Engine, confidence float64) Exclusion {
	x := Exclusion{MuUpOther: noBand()}
	var mu [5]float64
	for i := range mu {
		var err error
		if mu[i], err = e.ExpectedLimit(float64(i-2), confidence); err != nil {
			x.Why = err.Error()
		}
	}
	x.MuUp = band(mu)
	return x
}
