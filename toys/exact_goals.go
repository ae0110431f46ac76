package toys

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"lumireach/stats"
)

// ExactGoal is the luminosities of a goal by exact sums, for half, 80 % and 90 %
// of all experiments. Outcomes are discrete, so the chance to reach a goal rises in
// steps and falls between them: Bhattiprolu, Martin & Wells, arXiv:2009.07249.
type ExactGoal struct {
	First       [3]float64 // the lowest luminosity that reaches it
	AlwaysAfter [3]float64 // the luminosity from which on it never fails again
	Why         [3]string  // for those that are NaN
}

// exactGoals solves goals around the roots of the formulas.
func (r *runner) exactGoals(search stats.Search, goals []Goal) error {
	for i := range goals {
		g := &goals[i]
		g.Exact = &ExactGoal{}
		roots := g.Formula.roots()
		whys := [3]string{g.Formula.Why, g.Formula.Why80, g.Formula.Why90}
		var wanted []float64
		for k, root := range roots {
			g.Exact.First[k], g.Exact.AlwaysAfter[k], g.Exact.Why[k] = math.NaN(), math.NaN(), whys[k]
			if !math.IsNaN(root) {
				wanted = append(wanted, root)
			}
		}
		if len(wanted) == 0 {
			continue
		}
		curve, err := r.exactCurve(search, g, slices.Min(wanted), slices.Max(wanted))
		if err != nil {
			return err
		}
		for k, root := range roots {
			if math.IsNaN(root) {
				continue
			}
			g.Exact.First[k], g.Exact.AlwaysAfter[k], err = curve(fractions[k])
			if err != nil {
				g.Exact.First[k], g.Exact.AlwaysAfter[k], g.Exact.Why[k] = math.NaN(), math.NaN(), err.Error()
			}
		}
	}
	return nil
}

// solver gives both luminosities for a fraction of experiments.
type solver func(fraction float64) (first, always float64, err error)

// goalReach is the ratio to the formula's roots within which exact goals are
// looked for.
const goalReach = 2

func (r *runner) exactCurve(search stats.Search, g *Goal, low, high float64) (solver, error) {
	if s, b, ok := plainCount(search, low, high); ok {
		if g.Name == "exclusion" {
			return exclusionSteps(s, b, 1-r.config.Confidence, low/goalReach, high*goalReach), nil
		}
		return discoverySteps(r.config.Mu*s, b, stats.PValue(g.Z), low/goalReach, high*goalReach), nil
	}
	return r.exactLattice(search, g, low/goalReach, high*goalReach)
}

// plainCount gives the signal and background per unit luminosity of a single
// count without parameters.
func plainCount(search stats.Search, low, high float64) (s, b float64, ok bool) {
	var rates [2][2]float64
	for i, l := range [2]float64{low, 2 * high} {
		e, err := search.Engine(l)
		if err != nil || e.Bins() != 1 || e.Params() > 0 {
			return 0, 0, false
		}
		b := e.Point(0, nil).Lambda[0]
		rates[i] = [2]float64{(e.Point(1, nil).Lambda[0] - b) / l, b / l}
	}
	const same = 1e-9
	for k := range rates[0] {
		if math.Abs(rates[0][k]-rates[1][k]) > same*rates[0][k] {
			return 0, 0, false
		}
	}
	return rates[0][0], rates[0][1], true
}

// discoverySteps goes through the counts n that a discovery takes. n serves up
// to the luminosity at which P(N >= n) without signal is p, and the chance of n
// grows until there.
func discoverySteps(s, b, p, low, high float64) solver {
	return func(fraction float64) (first, always float64, err error) {
		first, always = math.NaN(), math.NaN()
		end := func(n int) float64 { return stats.PoissonLower(n, 1-p) / b }
		n := 1
		for end(n) < low {
			n++
		}
		for begin := end(n - 1); begin < high; n++ {
			stop := end(n)
			excess := func(l float64) float64 { return stats.PoissonAtLeast(n, (s+b)*l) - fraction }
			switch {
			case excess(stop) < 0:
				always = math.NaN() // fails here as a whole
			case excess(begin) >= 0:
				if math.IsNaN(first) {
					first = begin
				}
				if math.IsNaN(always) {
					always = begin
				}
			default:
				root, err := stats.Root(excess, begin, stop, 1e-9*stop)
				if err != nil {
					return math.NaN(), math.NaN(), err
				}
				if math.IsNaN(first) {
					first = root
				}
				always = root
			}
			begin = stop
		}
		return first, always, unsettled(first, always)
	}
}

// exclusionSteps goes through the largest counts n that exclude μ = 1. n does
// from the luminosity on at which its CLs is α, and its probability without signal
// falls from there.
func exclusionSteps(s, b, alpha, low, high float64) solver {
	begin := func(n int) (float64, error) {
		// CLs falls from 1 to 0 with luminosity, and is below P(N <= n | (s+b)L)/P(0).
		excess := func(l float64) float64 {
			return stats.PoissonAtMost(n, (s+b)*l)/stats.PoissonAtMost(n, b*l) - alpha
		}
		top := 1 / s
		for excess(top) > 0 {
			top *= 2
		}
		return stats.Root(excess, 0, top, 1e-10*top)
	}
	return func(fraction float64) (first, always float64, err error) {
		first, always = math.NaN(), math.NaN()
		from, err := begin(0)
		for n := 0; err == nil && from < high; n++ {
			var to float64
			if to, err = begin(n + 1); err != nil {
				break
			}
			if stats.PoissonAtMost(n, b*from) >= fraction {
				if math.IsNaN(first) {
					first = from
				}
				if math.IsNaN(always) {
					always = from
				}
			}
			if stats.PoissonAtMost(n, b*to) < fraction {
				always = math.NaN() // fails at the end of this step
			}
			from = to
		}
		if err != nil {
			return math.NaN(), math.NaN(), err
		}
		return first, always, unsettled(first, always)
	}
}

func unsettled(first, always float64) error {
	if math.IsNaN(first) || math.IsNaN(always) {
		return fmt.Errorf("the exact goal lies more than a factor %v from the formula's", goalReach)
	}
	return nil
}

// latticeStep is the ratio of neighbouring luminosities at which other curves
// are looked at, and latticeNear how many neighbours of a crossing are. The steps
// of two counts, or of one with an uncertainty, are mostly finer and not seen.
const (
	latticeStep = 1.01
	latticeNear = 4
)

// exactLattice looks at the chance of a goal at close luminosities, where it is
// wanted.
func (r *runner) exactLattice(search stats.Search, g *Goal, low, high float64) (solver, error) {
	n := 1 + int(math.Ceil(math.Log(high/low)/math.Log(latticeStep)))
	at := func(k float64) float64 { return low * math.Pow(latticeStep, k) }
	known := map[int]float64{}
	// look makes the chances at lattice points known.
	look := func(points ...int) error {
		points = slices.DeleteFunc(points, func(k int) bool {
			_, seen := known[k]
			return seen || k < 0 || k >= n
		})
		chances, failures := make([]float64, len(points)), make([]error, len(points))
		err := r.share(len(points), func() func(int) {
			return func(i int) {
				e, err := search.Engine(at(float64(points[i])))
				if err == nil {
					chances[i], err = exactChance(e, g, r.config)
				}
				failures[i] = err
			}
		})
		for i, k := range points {
			known[k] = chances[i]
		}
		return errors.Join(append(failures, err)...)
	}
	if err := latticeCost(search, at(float64(n/2))); err != nil {
		return func(float64) (float64, float64, error) { return math.NaN(), math.NaN(), err }, nil
	}
	return func(fraction float64) (first, always float64, err error) {
		first, always = math.NaN(), math.NaN()
		below, above := 0, n-1
		if err := look(below, above); err != nil {
			return first, always, err
		}
		if known[below] >= fraction || known[above] < fraction {
			return first, always, unsettled(first, always)
		}
		for above-below > 1 {
			middle := (below + above) / 2
			if err := look(middle); err != nil {
				return first, always, err
			}
			if known[middle] >= fraction {
				above = middle
			} else {
				below = middle
			}
		}
		from, to := max(0, below-latticeNear), min(n-1, above+latticeNear)
		var near []int
		for k := from; k <= to; k++ {
			near = append(near, k)
		}
		if err := look(near...); err != nil {
			return first, always, err
		}
		for k := from + 1; k <= to; k++ {
			if known[k-1] >= fraction || known[k] < fraction {
				continue
			}
			always = at(float64(k-1) + (fraction-known[k-1])/(known[k]-known[k-1]))
			if math.IsNaN(first) {
				first = always
			}
		}
		return first, always, nil
	}, nil
}

// latticeCost refuses what would take longer than toys.
func latticeCost(search stats.Search, luminosity float64) error {
	const most = 20000 // outcomes times auxiliary values
	e, err := search.Engine(luminosity)
	if err != nil {
		return err
	}
	o, err := newOutcomes(e, []float64{0, 1}, leastLimit, limitReach, limitStep)
	if err != nil {
		return err
	}
	if n := len(o.counts) * len(o.a); n > most {
		return fmt.Errorf("exact goals are left out where more than %d outcomes matter", most)
	}
	return nil
}

// exactChance is the fraction of experiments that reach a goal.
func exactChance(e *stats.Engine, g *Goal, c Config) (float64, error) {
	if g.Name == "exclusion" {
		_, excluded, err := excludedExactly(e, 1-c.Confidence)
		return excluded, err
	}
	t, err := exactTable(e, c.Mu, g.Z)
	if err != nil {
		return math.NaN(), err
	}
	return t.chance(g.Z), t.failed
}

// excludedExactly is the probabilities that μ = 1 is excluded, if it is true and
// without signal: of CLs <= alpha.
func excludedExactly(e *stats.Engine, alpha float64) (signal, background float64, err error) {
	o, err := newOutcomes(e, []float64{0, 1}, leastLimit, limitReach, limitStep)
	if err != nil {
		return math.NaN(), math.NaN(), err
	}
	t, err := o.qTilde(1)
	if err != nil {
		return math.NaN(), math.NaN(), err
	}
	if t.order == nil {
		low, high := 0.0, slices.Max(t.root)
		for high-low > 1e-10*(1+high) {
			middle := (low + high) / 2
			if t.atLeast(middle, 1, false) > alpha*t.atLeast(middle, 0, false) {
				low = middle
			} else {
				high = middle
			}
		}
		return t.atLeast(high, 1, true), t.atLeast(high, 0, true), t.failed
	}
	for i, row := range t.order {
		last := i+1 == len(t.order) || t.root[t.order[i+1]] < t.root[row]-tied(t.root[row])
		if last && t.sums[1][i+1] <= alpha*t.sums[0][i+1] {
			signal, background = t.sums[1][i+1], t.sums[0][i+1]
		}
	}
	return signal, background, nil
}
