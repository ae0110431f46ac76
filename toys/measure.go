package toys

import (
	"math"
	"sort"

	"lumireach/stats"
)

// measurement is what toys say at one luminosity about the three fractions of
// experiments: the quantity that a formula gives too, and its bootstrap
// replicas.
type measurement struct {
	luminosity float64
	value      [3]float64
	bound      [3]float64 // how far failed fits could move it
	step       [3]float64 // to the next discrete outcome, 0 where outcomes lie close
	replicas   [3][]float64
	toys       int
	failed     int
}

func newMeasurement(luminosity float64) measurement {
	m := measurement{luminosity: luminosity}
	for k := range m.replicas {
		m.replicas[k] = make([]float64, replicas)
	}
	return m
}

// resample calls do with the multiplicities of bootstrap replicas of so many
// blocks (Efron, Ann. Stat. 7 (1979) 1), several at a time. Equal keys give equal
// replicas.
func (r *runner) resample(use purpose, luminosity float64, blocks int, do func(replica int, multiplicity []float64)) error {
	s := newStream()
	s.restart(key{r.config.Seed, bootstrap + use, luminosity, 0, 0})
	var drawn [replicas][]float64
	for k := range drawn {
		drawn[k] = make([]float64, blocks)
		for range blocks {
			drawn[k][s.Intn(blocks)]++
		}
	}
	return r.share(replicas, func() func(int) {
		return func(k int) { do(k, drawn[k]) }
	})
}

// measureDiscovery throws the toys of a discovery goal at one luminosity: the
// significance that each fraction of experiments reaches.
func (r *runner) measureDiscovery(e *stats.Engine, luminosity, goal float64, toys int) (measurement, error) {
	m := newMeasurement(luminosity)
	signal, err := r.signal(e, luminosity, toys)
	if err != nil {
		return m, err
	}
	const near = 1.3 // standard deviations from the goal that a correction is fitted in
	var needed []float64
	if len(signal.toys) > 0 {
		for _, fraction := range fractions {
			if q := signal.quantile(1 - fraction); math.Abs(math.Sqrt(q)-goal) < near {
				needed = append(needed, q)
			}
		}
	}
	null, err := r.null(e, luminosity, span{goal - 1, goal + 1}, toys, needed)
	if err != nil {
		return m, err
	}
	r.check(null)
	m.toys = len(signal.toys) + signal.failed + null.total
	m.failed = signal.failed + null.failing
	if len(signal.toys) == 0 || len(null.toys) == 0 {
		for k := range m.value {
			m.value[k] = math.NaN()
		}
		return m, nil
	}
	var q [3][]float64
	for k, fraction := range fractions {
		u := 1 - fraction
		e := null.p(signal.quantile(u))
		m.value[k] = stats.Significance(e.p)
		if !null.trusts(e) {
			m.value[k] = math.NaN()
		}
		if m.failed > 0 {
			lift := float64(signal.failed) / float64(len(signal.toys))
			high := null.p(signal.quantile(math.Min(1, u+lift))).p
			low := null.p(signal.quantile(math.Max(0, u-lift))).p + null.failed/float64(null.total)
			m.bound[k] = (stats.Significance(high) - stats.Significance(low)) / 2
		}
		m.step[k] = null.step(signal, u)
		q[k] = make([]float64, replicas)
	}
	if err := r.resample(signalToys, luminosity, signal.blocks, func(b int, multiplicity []float64) {
		for k, fraction := range fractions {
			q[k][b] = signal.resampled(1-fraction, multiplicity)
		}
	}); err != nil {
		return m, err
	}
	return m, r.resample(nullToys, luminosity, null.blocks, func(b int, multiplicity []float64) {
		for k := range fractions {
			m.replicas[k][b] = stats.Significance(null.resampled(q[k][b], multiplicity))
		}
	})
}

// measureExclusion throws the toys of the exclusion goal at one luminosity: the
// normal quantile of the fraction of experiments without signal whose CLs at
// μ = 1 is at most α. The value is the same for all fractions.
func (r *runner) measureExclusion(e *stats.Engine, luminosity float64, toys int) (measurement, error) {
	m := newMeasurement(luminosity)
	s, err := r.joint(e, luminosity, exclusionToys, []float64{1}, toys/3)
	if err != nil {
		return m, err
	}
	alpha := 1 - r.config.Confidence
	value, step := s.excluded(alpha, s.once(), 0)
	bound := 0.0
	if m.failed = s.failures(); m.failed > 0 {
		high, _ := s.excluded(alpha, s.once(), 1)
		low, _ := s.excluded(alpha, s.once(), -1)
		bound = math.Abs(high-low) / 2
	}
	m.toys = s.size()
	for k := range m.value {
		m.value[k], m.bound[k], m.step[k] = value, bound, step
	}
	return m, r.resample(exclusionToys, luminosity, len(s.blocks), func(b int, multiplicity []float64) {
		v, _ := s.excluded(alpha, multiplicity, 0)
		for k := range m.replicas {
			m.replicas[k][b] = v
		}
	})
}

// stepShare is the probability from which tied experiments make an answer move
// in steps.
const stepShare = 0.01

// step is how far the significance of the next discrete outcome is from that of
// the u-quantile of signal toys, on the nearer side; 0 where outcomes that tie are
// rarer than stepShare.
func (t *tail) step(signal *ranked, u float64) float64 {
	q := signal.quantile(u)
	n := len(signal.toys)
	first := sort.Search(n, func(i int) bool { return signal.toys[i].q >= q-tie })
	next := sort.Search(n, func(i int) bool { return signal.toys[i].q > q+tie })
	if float64(next-first) < stepShare*float64(n) || first == 0 || next == n {
		return 0
	}
	z := func(i int) float64 { return stats.Significance(math.Min(1, t.p(signal.toys[i].q).p)) }
	return math.Min(z(next)-z(first), z(first)-z(first-1))
}

// excluded is the normal quantile of the probability, without signal, of CLs <=
// alpha at the first node, and how far it would move by one more discrete outcome,
// 0 where outcomes are rarer than stepShare. CLs rises as q̃ falls, but for the noise of
// the toys, which can carry it across alpha more than once: the middle of those
// places is taken.
func (s *jointSample) excluded(alpha float64, multiplicity []float64, fails int) (quantile, step float64) {
	w := s.walk(0, multiplicity, fails)
	first, last, before, after, above := 0.0, 0.0, 0.0, math.NaN(), false
	for w.next() {
		here := w.sum0 / w.total0
		if above = above || w.cls() > alpha; !above {
			first = here
		} else if math.IsNaN(after) {
			after = here
		}
		if w.cls() <= alpha {
			last = here
		}
		before = here
	}
	if math.IsNaN(after) {
		after = before
	}
	quantile = stats.PhiInverse((first + last) / 2)
	if after-first > stepShare {
		step = stats.PhiInverse(after) - quantile
	}
	return quantile, step
}
