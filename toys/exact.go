package toys

import (
	"fmt"
	"math"
	"slices"
	"sort"

	"lumireach/stats"
)

// Probabilities below these, of all that is summed, are left out.
const (
	leastShare = 1e-10 // of the smallest tail that is asked for
	leastLimit = 1e-9  // for limits, whose tails are of a few per cent
)

// Auxiliary values are tabulated this far and at this spacing, in standard
// deviations: for limits, and for a tail beyond its significance.
const (
	limitReach = 6
	limitStep  = 0.4
	tailReach  = 3
	tailStep   = 0.4
)

// exactly gives the answers at one luminosity by sums over all outcomes, where
// they can be enumerated; enumerable is to be asked before.
func exactly(e *stats.Engine, c Config, formula Answer) ExactAnswer {
	var a ExactAnswer
	var err error
	if e.Bare() > 0 {
		a.Discovery = noDiscovery(stats.ErrOneEvent.Error(), -math.Expm1(-c.Mu*e.Bare()))
	} else if a.Discovery, err = exactDiscovery(e, c.Mu, math.Max(formula.Discovery.Z.Plus2, conventions[1])); err != nil {
		a.Discovery = noDiscovery(err.Error(), math.NaN())
	}
	a.Exclusion = exactExclusion(e, c.Confidence, formula.Exclusion.MuUp)
	excluded, _, err := excludedExactly(e, 1-c.Confidence)
	if a.Coverage = 1 - excluded; err != nil {
		a.CoverageWhy = err.Error()
	}
	return a
}

// exactTable is q0 of all outcomes under background only and under a signal, for
// tails up to a significance.
func exactTable(e *stats.Engine, mu, reach float64) (*table, error) {
	reach = math.Min(reach+1.5, largestZ-1)
	o, err := newOutcomes(e, []float64{0, mu}, leastShare*stats.PValue(reach), reach+tailReach, tailStep)
	if err != nil {
		return nil, err
	}
	return o.q0()
}

func exactDiscovery(e *stats.Engine, mu, reach float64) (Discovery, error) {
	t, err := exactTable(e, mu, reach)
	if err != nil {
		return Discovery{}, err
	}
	d := Discovery{ZAtLeast: noBand(), ChanceOne: math.NaN()}
	var z [5]float64
	for i, u := range quantiles {
		// The smallest q with P(q0 <= q) >= u.
		root := t.upper(1-u, 1)
		if t.order != nil {
			root = t.quantile(u, 1)
		}
		z[i] = math.Max(0, stats.Significance(math.Min(1, t.atLeast(root, 0, true))))
	}
	d.Z = band(z)
	d.Chance3 = t.chance(conventions[0])
	d.Chance5 = t.chance(conventions[1])
	return d, t.failed
}

// quantile is the smallest root with P(root <= it) >= u under hypothesis h, for
// discrete outcomes.
func (t *table) quantile(u float64, h int) float64 {
	sum := 0.0
	for i := len(t.order) - 1; i >= 0; i-- {
		if sum += t.p[h][t.order[i]]; sum >= u-1e-12 {
			return t.root[t.order[i]]
		}
	}
	return t.root[t.order[0]]
}

// chance is the probability under the second hypothesis of a significance of at
// least z under the first.
func (t *table) chance(z float64) float64 {
	root := t.within(stats.PValue(z), 0)
	if math.IsInf(root, 1) {
		return 0
	}
	return t.atLeast(root, 1, true)
}

// exactExclusion solves CLs = α at the quantile outcomes.
func exactExclusion(e *stats.Engine, confidence float64, formula Band) Exclusion {
	x := Exclusion{MuUp: noBand(), MuUpOther: noBand()}
	high := formula.Plus2
	if math.IsNaN(high) {
		x.Why = "the formulas give no limit to begin at"
		return x
	}
	// Between the first two hypotheses lie others, whose outcomes count as well.
	hypotheses := append([]float64{0, high * 1.5}, formula.Minus2, formula.Median, formula.Plus1)
	o, err := newOutcomes(e, hypotheses, leastLimit, limitReach, limitStep)
	if err != nil {
		x.Why = err.Error()
		return x
	}
	l := exactLimits{outcomes: o, goal: stats.PhiInverse(1 - confidence)}
	var mu [5]float64
	for _, start := range formula.list() {
		if err := l.visit(math.Log(start)); err != nil {
			x.Why = err.Error()
			return x
		}
	}
	for i := range mu {
		if mu[i], err = l.solve(i); err != nil {
			mu[i], x.Why = math.NaN(), err.Error()
		}
	}
	x.MuUp = band(mu)
	return x
}

// exactLimits finds limits on one set of outcomes. What was found at one signal
// strength serves all five.
type exactLimits struct {
	*outcomes
	goal  float64 // Φ⁻¹(α)
	known []strength
}

// strength is Φ⁻¹(CLs) of the quantile outcomes at a signal strength.
type strength struct {
	logMu float64
	z     [5]float64
}

// visit adds a signal strength to those known, which stay in rising order.
func (l *exactLimits) visit(logMu float64) error {
	s := strength{logMu: logMu}
	mu := math.Exp(logMu)
	l.weigh(mu)
	t, err := l.qTilde(mu)
	if err != nil {
		return err
	}
	for i, u := range quantiles {
		root := t.upper(u, 0)
		below := t.atLeast(root, 0, true)
		if t.order == nil && below > 0 {
			// Once more, by how far interpolation was off.
			root = t.upper(u*t.atLeast(root, 0, false)/below, 0)
			below = t.atLeast(root, 0, true)
		}
		s.z[i] = stats.PhiInverse(t.atLeast(root, 1, true) / below)
	}
	if t.failed != nil {
		return t.failed
	}
	at := sort.Search(len(l.known), func(k int) bool { return l.known[k].logMu > logMu })
	l.known = slices.Insert(l.known, at, s)
	return nil
}

// weigh makes mu the second hypothesis.
func (o *outcomes) weigh(mu float64) {
	lambda := o.engine.Point(mu, nil).Lambda
	for row, n := range o.counts {
		sum := 0.0
		for bin, l := range lambda {
			sum += stats.LogPoisson(int(n[bin]), l)
		}
		o.p[1][row] = math.Exp(sum)
	}
}

// solve finds the i-th quantile's limit: the last strength at which Φ⁻¹(CLs), which
// falls, is above goal.
func (l *exactLimits) solve(i int) (float64, error) {
	const (
		most    = 60
		closest = 2e-7 // of ln μ
	)
	before := math.NaN()
	for round := range most {
		n := sort.Search(len(l.known), func(k int) bool { return l.known[k].z[i] <= l.goal })
		next := 0.0
		switch {
		case n == 0:
			next = l.known[0].logMu - 0.3
		case n == len(l.known):
			next = l.known[n-1].logMu + 0.3
		default:
			low, high := l.known[n-1], l.known[n]
			if high.logMu-low.logMu < closest {
				return math.Exp(high.logMu), nil
			}
			next = l.interpolate(i, n)
			if math.Abs(next-before) < closest {
				return math.Exp(next), nil
			}
			before = next
			// Interpolation can stay at one end of a step in CLs.
			if round%4 == 3 {
				next = (low.logMu + high.logMu) / 2
			}
		}
		if err := l.visit(next); err != nil {
			return math.NaN(), err
		}
	}
	return math.NaN(), fmt.Errorf("CLs does not settle at the confidence level")
}

// interpolate is where the i-th quantile's curve meets goal between the known
// strengths n-1 and n: the inverse cubic through the nearest of them, or a
// straight line where that leaves the bracket.
func (l *exactLimits) interpolate(i, n int) float64 {
	low, high := l.known[n-1], l.known[n]
	near := l.known[max(0, n-2):min(len(l.known), n+2)]
	x := 0.0
	for j, a := range near {
		term := a.logMu
		for k, b := range near {
			if k != j {
				term *= (l.goal - b.z[i]) / (a.z[i] - b.z[i])
			}
		}
		x += term
	}
	if x > low.logMu && x < high.logMu {
		return x
	}
	return low.logMu + (high.logMu-low.logMu)*(l.goal-low.z[i])/(high.z[i]-low.z[i])
}
