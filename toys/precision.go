package toys

import (
	"context"
	"errors"
	"fmt"
	"math"
	"time"
)

const (
	firstToys = 1000       // of a run by precision
	mostToys  = 50_000_000 // where a run by precision gives up
)

// precisely runs once with Config.Toys or, where a precision is asked for, again
// and again with more toys until the worst relative error is below it or the
// time is over. note tells on the result how it went.
func precisely[T any](ctx context.Context, c Config, run func(context.Context, Config) (T, float64, error), note func(T, string)) (T, error) {
	if c.Precision == 0 {
		result, _, err := run(ctx, c)
		return result, err
	}
	var best T
	reached, thrown := math.NaN(), 0
	began := time.Now()
	c.Toys = firstToys
	say := func(done string) (T, error) {
		note(best, fmt.Sprintf("%s: known to %.2g of itself or better; --toys %d gives the same again", done, reached, thrown))
		return best, nil
	}
	for {
		attempt, cancel := ctx, context.CancelFunc(func() {})
		if c.Within > 0 {
			attempt, cancel = context.WithDeadline(ctx, began.Add(c.Within))
		}
		start := time.Now()
		result, worst, err := run(attempt, c)
		cancel()
		switch {
		case errors.Is(err, context.DeadlineExceeded) && ctx.Err() == nil:
			if math.IsNaN(reached) {
				return best, fmt.Errorf("%v is too short for %d toys, the fewest of a run by precision", c.Within, firstToys)
			}
			return say("the time is over")
		case err != nil:
			return best, err
		}
		best, reached, thrown = result, worst, c.Toys
		if worst <= c.Precision {
			return say("the precision asked for is reached")
		}
		// Errors fall with the square root; a tenth more, not to fall just short.
		growth := math.Max(1.3, math.Min(16, 1.1*math.Pow(worst/c.Precision, 2)))
		more := int(growth * float64(c.Toys))
		if more > mostToys {
			return say(fmt.Sprintf("more than %d toys would be needed", mostToys))
		}
		if c.Within > 0 && time.Since(began)+time.Duration(float64(time.Since(start))*float64(more)/float64(c.Toys)) > c.Within {
			return say("the time allows no more")
		}
		c.Toys = more
	}
}

// relative is an error relative to a value, of a significance below 1 to 1.
func relative(err, value, least float64) float64 {
	if math.IsNaN(value) || math.IsNaN(err) {
		return 0 // what has no number cannot be made more precise
	}
	return err / math.Max(least, math.Abs(value))
}

// worst is the largest relative error of the medians and goals.
func (r *ReachResult) worst() float64 {
	w := 0.0
	for _, p := range r.Points {
		if p.Toys == nil {
			continue
		}
		d, x := p.Toys.Discovery, p.Toys.Exclusion
		w = math.Max(w, relative(d.ZError.Median, d.Z.Median, 1))
		w = math.Max(w, relative(x.MuUpError.Median, x.MuUp.Median, 0))
	}
	for _, g := range r.Goals {
		if t := g.Toys; t != nil {
			w = math.Max(w, relative(t.Error, t.Luminosity, 0))
			w = math.Max(w, relative(t.Error80, t.Luminosity80, 0))
			w = math.Max(w, relative(t.Error90, t.Luminosity90, 0))
		}
	}
	return w
}
