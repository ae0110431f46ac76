package toys

import (
	"fmt"
	"math"
	"sort"

	"lumireach/stats"
)

// quantiles are Φ(-2), Φ(-1), ½, Φ(1), Φ(2), in the order of Band.
var quantiles = [5]float64{stats.Phi(-2), stats.Phi(-1), 0.5, stats.Phi(1), stats.Phi(2)}

// conventions are the significances called evidence and discovery.
var conventions = [2]float64{3, 5}

// oneSigma and twoSigma are the confidences of one and two standard errors.
var oneSigma, twoSigma = 1 - 2*stats.PValue(1), 1 - 2*stats.PValue(2)

// throw throws toys of proposals and takes their q0, with their weights under
// the first of them, in the order of blocks and proposals.
func (r *runner) throw(e *stats.Engine, luminosity float64, use purpose, proposals []proposal) (sample, error) {
	m, err := r.newMixture(proposals)
	if err != nil {
		return sample{}, err
	}
	starts := m.blockStarts()
	blocks := len(starts) - 1
	s := sample{toys: make([]weighted, starts[blocks]), blocks: blocks}
	for _, p := range proposals {
		s.thrown = append(s.thrown, p.toys)
	}
	err = r.run(e, len(proposals), blocks, func(w *worker, block int) {
		place := s.toys[starts[block]:starts[block+1]]
		i := 0
		for component := range proposals {
			w.stream.restart(key{r.config.Seed, use, luminosity, component, block})
			for range m.inBlock(component, block, blocks) {
				q := math.NaN()
				if m.throw(w, component) {
					if value, status := w.fit.Q0(&w.data, proposals[component].near); status == stats.Converged {
						q = value
					}
				}
				weight := 1.0
				if len(proposals) > 1 {
					m.logDensities(w)
					m.balance(w.logs)
					weight = w.logs[0]
				}
				place[i] = weighted{q, weight, component, block}
				i++
			}
		}
		r.done(len(place))
	})
	return s, err
}

// signal throws signal-plus-background toys.
func (r *runner) signal(e *stats.Engine, luminosity float64, toys int) (*ranked, error) {
	mu := r.config.Mu
	s, err := r.throw(e, luminosity, signalToys, []proposal{r.at(e, mu, toys)})
	if err != nil {
		return nil, err
	}
	return rank(s), nil
}

// mostRounds is how often a tail that is not trusted as far as it is asked for
// is thrown anew, with twice the toys and a finer set of centres.
const mostRounds = 4

// null throws background-only toys for the tails of the significances wanted,
// until they are trusted at every q0 in needed or the rounds are over.
func (r *runner) null(e *stats.Engine, luminosity float64, wanted span, toys int, needed []float64) (*tail, error) {
	for round := 1; ; round++ {
		t, err := r.nullOnce(e, luminosity, wanted, toys, round)
		if err != nil || round == mostRounds || t.trustsAll(needed) {
			return t, err
		}
		r.mutex.Lock()
		r.progress.Total += int64(2 * toys)
		r.mutex.Unlock()
		toys *= 2
	}
}

func (r *runner) nullOnce(e *stats.Engine, luminosity float64, wanted span, toys, round int) (*tail, error) {
	proposals, err := r.tailProposals(e, wanted, toys, min(round, 2))
	if err != nil {
		return nil, err
	}
	s, err := r.throw(e, luminosity, nullToys, proposals)
	if err != nil {
		return nil, err
	}
	return newTail(s), nil
}

// discover throws what discovery at one luminosity needs.
func (r *runner) discover(e *stats.Engine, luminosity float64, formula Band) (Discovery, error) {
	c := r.config
	if bare := e.Bare(); bare > 0 {
		return noDiscovery(stats.ErrOneEvent.Error(), -math.Expm1(-c.Mu*bare)), nil
	}
	signal, err := r.signal(e, luminosity, c.Toys)
	if err != nil {
		return Discovery{}, err
	}
	var needed []float64
	if len(signal.toys) > 0 {
		for _, u := range quantiles {
			needed = append(needed, signal.quantile(u))
		}
	}
	for _, z := range conventions {
		if math.Abs(z-formula.Median) < 2 {
			needed = append(needed, z*z)
		}
	}
	null, err := r.null(e, luminosity, span{formula.Minus2, formula.Plus2}, c.Toys, needed)
	if err != nil {
		return Discovery{}, err
	}
	r.check(null)
	return summarise(signal, null), nil
}

// noDiscovery is an answer without a significance, for the reason given.
func noDiscovery(why string, one float64) Discovery {
	n := math.NaN()
	return Discovery{
		Z: noBand(), ZError: noBand(), ZAtLeast: noBand(),
		Chance3: n, Chance3Error: n, Chance5: n, Chance5Error: n, ChanceOne: one,
		Why: why, ChanceWhy: why,
	}
}

// summarise turns each signal-plus-background toy's q0 into a significance by
// the null's tail. Significance grows with q0, so its quantiles are those of
// q0, turned.
func summarise(signal *ranked, null *tail) Discovery {
	d := Discovery{
		ZAtLeast: noBand(), ChanceOne: math.NaN(),
		Toys: len(signal.toys) + signal.failed, NullToys: null.total,
		FailedFits: signal.failed + null.failing, Tail: null.reach(),
	}
	if len(signal.toys) == 0 || len(null.toys) == 0 {
		none := noDiscovery("every fit failed", math.NaN())
		none.Toys, none.NullToys, none.FailedFits = d.Toys, d.NullToys, d.FailedFits
		return none
	}
	why := fmt.Sprintf("too few of %d background-only toys share the tail: more are needed", null.total)
	var z, zError, atLeast [5]float64
	for i, u := range quantiles {
		value, err, ok := null.z(signal.quantile(u))
		z[i], atLeast[i] = value, math.NaN()
		if !ok {
			zError[i], atLeast[i] = math.NaN(), null.atLeast(signal.quantile(u))
			d.Why = why
			continue
		}
		zError[i] = math.Hypot(err, quantileError(signal, u, null))
	}
	d.Z, d.ZError, d.ZAtLeast = band(z), band(zError), band(atLeast)
	d.Chance3, d.Chance3Error = chance(signal, null, conventions[0])
	d.Chance5, d.Chance5Error = chance(signal, null, conventions[1])
	if math.IsNaN(d.Chance3) || math.IsNaN(d.Chance5) {
		d.ChanceWhy = why
	}
	return d
}

// quantileError is the standard error of the u-quantile's significance from the
// signal sample alone, by order statistics. Failed fits may stand at either
// end, which widens it. The steps of sqrt(q0) stand in for those of the
// significance where the null does not reach.
func quantileError(signal *ranked, u float64, null *tail) float64 {
	n := len(signal.toys)
	half := func(confidence float64) float64 {
		low, high := stats.QuantileInterval(n, u, confidence)
		low, high = max(0, low-signal.failed), min(n-1, high+signal.failed)
		qLow, qHigh := signal.toys[low].q, signal.toys[high].q
		zLow, _, okLow := null.z(qLow)
		zHigh, _, okHigh := null.z(qHigh)
		if !okLow || !okHigh {
			zLow, zHigh = math.Sqrt(qLow), math.Sqrt(qHigh)
		}
		return (zHigh - zLow) / 2
	}
	one, two := half(oneSigma), half(twoSigma)
	// Where the quantile lies near the edge of a discrete outcome, one standard
	// error sees nothing of the next and two do.
	if two > 3*one {
		return two
	}
	return one
}

// chance is the probability of a significance of at least z, with the errors of
// both samples.
func chance(signal *ranked, null *tail, z float64) (p, err float64) {
	probability := stats.PValue(z)
	n := len(signal.toys)
	above := func(threshold float64) int {
		return n - sort.Search(n, func(i int) bool { return signal.toys[i].q > threshold+tie })
	}
	threshold, ok := null.threshold(probability)
	if !ok {
		// The threshold lies between two that are sure. Where few toys do as well,
		// it need not be known better.
		const between = 0.01
		lower, upper := null.around(probability)
		few, most := above(upper), above(lower)
		low, high := stats.BinomialInterval(few, n, oneSigma)
		if float64(most-few) > between*float64(n) {
			return math.NaN(), math.NaN()
		}
		return float64(few+most) / float64(2*n), (high-low+float64(most-few)/float64(n))/2 + float64(signal.failed)/float64(n)
	}
	k := above(threshold)
	low, high := stats.BinomialInterval(k, n, oneSigma)
	err = (high-low)/2 + float64(signal.failed)/float64(n)
	// What the null's own error lets the threshold move.
	if e := null.p(threshold); e.p > 0 {
		relative := e.err / e.p
		lower, _ := null.threshold(probability / (1 + relative))
		upper, _ := null.threshold(probability * (1 + relative))
		err = math.Hypot(err, float64(above(upper)-above(lower))/(2*float64(n)))
	}
	return float64(k) / float64(n), err
}
