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

// result is what a run gives.
type result interface {
	worst() float64 // largest relative error
	note(string)    // adds how the run went
}

// precisely runs once with Config.Toys or, where a precision is asked for, again
// and again with more toys until the worst relative error is below it or the
// time is over.
func precisely[T result](ctx context.Context, c Config, run func(*runner) (T, error)) (T, error) {
	var best T
	if err := c.complete(); err != nil {
		return best, err
	}
	if c.Precision == 0 {
		return run(newRunner(ctx, c))
	}
	began := time.Now()
	thrown := 0
	done := func(why string) (T, error) {
		best.note(fmt.Sprintf("%s: all that has a number is known to %.2g of itself or better; --toys %d gives the same again", why, best.worst(), thrown))
		return best, nil
	}
	for c.Toys = firstToys; ; {
		attempt, cancel := ctx, context.CancelFunc(func() {})
		if c.Within > 0 {
			attempt, cancel = context.WithDeadline(ctx, began.Add(c.Within))
		}
		start := time.Now()
		result, err := run(newRunner(attempt, c))
		cancel()
		switch {
		case errors.Is(err, context.DeadlineExceeded) && ctx.Err() == nil:
			if thrown == 0 {
				return best, fmt.Errorf("%v is too short for %d toys, the fewest of a run by precision", c.Within, firstToys)
			}
			return done("the time is over")
		case err != nil:
			return best, err
		}
		best, thrown = result, c.Toys
		worst := best.worst()
		if worst <= c.Precision {
			return done("the precision asked for is reached")
		}
		// Errors fall with the square root; a tenth more, not to fall just short.
		growth := math.Max(1.3, math.Min(16, 1.1*math.Pow(worst/c.Precision, 2)))
		more := int(growth * float64(c.Toys))
		if more > mostToys {
			return done(fmt.Sprintf("more than %d toys would be needed", mostToys))
		}
		if c.Within > 0 && time.Since(began)+time.Duration(float64(time.Since(start))*growth) > c.Within {
			return done("the time allows no more")
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

func (r *ReachResult) note(text string) { r.Notes = append(r.Notes, text) }

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
