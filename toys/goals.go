package toys

import (
	"errors"
	"fmt"
	"math"

	"lumireach/stats"
)

// fractions of all experiments that a goal is solved for.
var fractions = [3]float64{0.5, 0.8, 0.9}

// plateaus are what an infinite luminosity would give, NaN where there is no bound.
type plateaus struct{ z, mu float64 }

// formulaGoals solves the goals by the asymptotic formulas, from a hundredth of
// the first luminosity listed to a hundred times the last. The exclusion goal is
// of μ = 1 whatever strength is hoped for.
func formulaGoals(search stats.Search, c Config) ([]Goal, plateaus, error) {
	first, last := c.Luminosities[0], c.Luminosities[0]
	for _, l := range c.Luminosities {
		first, last = math.Min(first, l), math.Max(last, l)
	}
	medianZ := func(e *stats.Engine) (float64, error) { return e.MedianZ(c.Mu) }
	limit := func(e *stats.Engine) (float64, error) { return e.ExpectedLimit(0, c.Confidence) }
	// A plateau that cannot be computed, far beyond every luminosity asked for,
	// is not told of.
	var p plateaus
	var err error
	if p.z, err = search.Plateau(medianZ, last); err != nil {
		p.z = math.NaN()
	}
	if p.mu, err = search.Plateau(limit, last); err != nil {
		p.mu = math.NaN()
	}

	goals := []Goal{{Name: "evidence", Z: 3}, {Name: "discovery", Z: 5}, {Name: "exclusion", Confidence: c.Confidence}}
	for i := range goals {
		g := &goals[i]
		var luminosity [3]float64
		var why [3]string
		plateau := math.NaN()
		for k, fraction := range fractions {
			// A quantity that passes zero where this fraction of experiments
			// reaches the goal: Z is normal about its median with unit width.
			n := stats.PhiInverse(fraction)
			quantity := func(e *stats.Engine) (float64, error) {
				z, err := e.MedianZ(c.Mu)
				return z - n - g.Z, err
			}
			if g.Name == "exclusion" {
				quantity = func(e *stats.Engine) (float64, error) {
					reached, err := e.ExclusionN(c.Confidence)
					return reached - n, err
				}
			}
			luminosity[k], err = search.Luminosity(quantity, first/100, last*100)
			if err == nil {
				continue
			}
			luminosity[k], why[k] = math.NaN(), err.Error()
			switch {
			case errors.Is(err, stats.ErrReached):
				why[k] = fmt.Sprintf("reached below %.3g, a hundredth of the first luminosity listed", first/100)
				continue
			case !errors.Is(err, stats.ErrNotReached):
				continue
			}
			why[k] = fmt.Sprintf("not reached below %.3g, a hundred times the last luminosity listed", last*100)
			switch {
			case g.Name == "exclusion" && p.mu > 1:
				why[k] = fmt.Sprintf("not reached: systematic uncertainties keep the median limit above μ = %.3g", p.mu)
				plateau = p.mu
			case g.Name != "exclusion" && p.z < g.Z+n:
				why[k] = fmt.Sprintf("not reached: systematic uncertainties keep the median Z below %.3g", p.z)
				plateau = p.z
			}
		}
		g.Formula = GoalAnswer{
			Luminosity: luminosity[0], Luminosity80: luminosity[1], Luminosity90: luminosity[2],
			BeyondList: luminosity[0] < first || luminosity[0] > last,
			Plateau:    plateau,
			Why:        why[0], Why80: why[1], Why90: why[2],
		}
	}
	return goals, p, nil
}
