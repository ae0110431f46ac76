package toys

import (
	"context"
	"fmt"
	"math"

	"lumireach/stats"
)

// Bands gives the expected-limit bands on μ against luminosity, at the
// confidence asked for, by the asymptotic formulas and, where toys are asked
// for, by pseudo-experiments. Cancelling ctx ends it with ctx's error.
func Bands(ctx context.Context, search stats.Search, config Config) (*BandsResult, error) {
	return precisely(ctx, config, func(r *runner) (*BandsResult, error) { return bands(r, search) })
}

func bands(r *runner, search stats.Search) (*BandsResult, error) {
	c := r.config
	result := &BandsResult{Config: c}
	engines := make([]*stats.Engine, len(c.Luminosities))
	for i, l := range c.Luminosities {
		e, err := search.Engine(l)
		if err != nil {
			return nil, fmt.Errorf("luminosity %v: %w", l, err)
		}
		engines[i] = e
		result.Points = append(result.Points, BandsPoint{Luminosity: l, Formula: formulaExclusion(e, c.Confidence)})
		if c.Toys > 0 {
			r.progress.Total += r.plannedLimits(e, result.Points[i].Formula.MuUp)
		}
	}
	if enumerable(engines[0], c) {
		err := r.share(len(engines), func() func(int) {
			return func(i int) {
				x := exactExclusion(engines[i], c.Confidence, result.Points[i].Formula.MuUp)
				result.Points[i].Exact = &x
			}
		})
		if err != nil {
			return nil, err
		}
	}
	if c.Toys > 0 {
		for i := range result.Points {
			p := &result.Points[i]
			r.stage(fmt.Sprintf("luminosity %.4g", p.Luminosity))
			x, err := r.limits(engines[i], p.Luminosity, p.Formula.MuUp)
			if err != nil {
				return nil, err
			}
			p.Toys = &x
		}
	}
	result.Cautions = bandsCautions(result, engines)
	return result, nil
}

func (r *BandsResult) note(text string) { r.Notes = append(r.Notes, text) }

// worst is the largest relative error of the five limits.
func (r *BandsResult) worst() float64 {
	w := 0.0
	for _, p := range r.Points {
		if p.Toys == nil {
			continue
		}
		mu, errs := p.Toys.MuUp.list(), p.Toys.MuUpError.list()
		for i := range mu {
			w = math.Max(w, relative(errs[i], mu[i], 0))
		}
	}
	return w
}
