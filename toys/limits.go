package toys

import (
	"fmt"
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/stat"

	"lumireach/stats"
)

// limits throws the toys that the expected limits at one luminosity need: a
// pilot at the limits of the formulas, then the main sample at the limits of
// the pilot.
func (r *runner) limits(e *stats.Engine, luminosity float64, formula Band) (Exclusion, error) {
	share := max(r.config.Toys/5, fewestBlocks)
	alpha := 1 - r.config.Confidence
	start := r.pilotNodes(e, formula)
	pilot, err := r.joint(e, luminosity, pilotLimitToys, start, max(share/4, fewestBlocks))
	if err != nil {
		return Exclusion{}, err
	}
	rough := pilot.roots(alpha, pilot.outcomes(pilot.once(), 0))
	nodes := mainNodes(rough, start)
	thrown, failed := pilot.size(), pilot.failures()
	for round := 1; ; round++ {
		main, err := r.joint(e, luminosity, limitToys, nodes, share)
		if err != nil {
			return Exclusion{}, err
		}
		thrown += main.size()
		failed += main.failures()
		x, err := r.solve(main, luminosity, alpha)
		if err != nil {
			return Exclusion{}, err
		}
		if x.Why == "" || round == 2 {
			x.Toys, x.FailedFits = thrown, failed
			return x, nil
		}
		// A few pilot toys can put a node too far off: take the formulas', and what
		// these toys say, as well.
		nodes = spread(append(mainNodes(main.roots(alpha, main.outcomes(main.once(), 0)), start), append(nodes, start...)...))
	}
}

// plannedLimits is how many toys the limits of one luminosity take, as well as
// it can be told before the pilot's limits are known.
func (r *runner) plannedLimits(e *stats.Engine, formula Band) int64 {
	share := max(r.config.Toys/5, fewestBlocks)
	proposals := len(r.pilotNodes(e, formula)) + 5
	return int64(proposals * (share + max(share/4, fewestBlocks)))
}

// pilotNodes are the limits of the formulas, but none below the -ln α signal
// events, nearly, that an experiment which sees nothing excludes.
func (r *runner) pilotNodes(e *stats.Engine, formula Band) []float64 {
	least := -math.Log(1 - r.config.Confidence)
	events := signalEvents(e)
	var nodes []float64
	for _, mu := range []float64{formula.Minus2, formula.Minus1, formula.Median, formula.Plus1, formula.Plus2} {
		if !math.IsNaN(mu) {
			nodes = append(nodes, math.Max(mu, 0.97*least/events))
		}
	}
	if len(nodes) == 0 {
		nodes = append(nodes, least/events)
	}
	return spread(nodes)
}

// mainNodes are the roots of the pilot, kept within a factor 3 of its nodes.
func mainNodes(rough [5]float64, start []float64) []float64 {
	var nodes []float64
	for _, mu := range rough {
		if !math.IsNaN(mu) {
			nodes = append(nodes, math.Max(start[0]/3, math.Min(3*start[len(start)-1], mu)))
		}
	}
	if len(nodes) == 0 {
		nodes = start
	}
	return spread(nodes)
}

// spread merges nodes within 3 % and keeps at least three, which a quadratic needs.
func spread(nodes []float64) []float64 {
	slices.Sort(nodes)
	kept := nodes[:1]
	for _, mu := range nodes[1:] {
		if mu > 1.03*kept[len(kept)-1] {
			kept = append(kept, mu)
		}
	}
	for len(kept) < 3 {
		kept = append(kept, 1.25*kept[len(kept)-1])
		if len(kept) < 3 {
			kept = append([]float64{kept[0] / 1.25}, kept...)
		}
	}
	return kept
}

// outcome is the experiment at a quantile, as one node orders them.
type outcome struct {
	cls    float64
	q      float64 // its q̃ at the node
	weight float64 // probability, without signal, of all experiments tied with it
}

// outcomes gives, by node, the experiments at the quantiles of the limit, with
// the blocks weighted as given. Failed fits count as fails says: -1 in no tail,
// +1 in every tail, 0 not at all.
//
// No toy's own limit is ever computed: an experiment's limit is at most μ where
// its CLs(μ) is at most α, and that is so for all q̃_μ from some value on. So at
// each node the background toys are ordered by q̃, the outcome at the quantile
// is taken, ties included, and its CLs = P(q̃ >= q|μ)/P(q̃ >= q|0) (Read, J. Phys.
// G 28 (2002) 2693) is interpolated to α over ln μ.
func (s *jointSample) outcomes(multiplicity []float64, fails int) [][5]outcome {
	out := make([][5]outcome, len(s.nodes))
	for k := range s.nodes {
		out[k] = s.at5(k, multiplicity, fails)
	}
	return out
}

func (s *jointSample) at5(k int, multiplicity []float64, fails int) (out [5]outcome) {
	w := s.walk(k, multiplicity, fails)
	found, before := 0, w.sum0
	for found < len(quantiles) && w.next() {
		for found < len(quantiles) && (w.done() || w.sum0 >= quantiles[found]*w.total0) {
			out[found] = outcome{w.cls(), w.q, (w.sum0 - before) / w.total0}
			found++
		}
		before = w.sum0
	}
	return out
}

// walk goes through the outcomes of one node in falling order of q̃, summing
// their probabilities without signal and at the node's μ.
type walk struct {
	sample          *jointSample
	node            int
	multiplicity    []float64
	place           int
	q               float64 // of the outcome reached, ties included
	sum0, sumMu     float64
	total0, totalMu float64
}

func (s *jointSample) walk(k int, multiplicity []float64, fails int) *walk {
	w := &walk{sample: s, node: k, multiplicity: multiplicity}
	for _, p := range s.order[k] {
		w0, wMu := w.weights(p)
		w.total0 += w0
		w.totalMu += wMu
	}
	if fails != 0 {
		for _, p := range s.bad[k] {
			w0, wMu := w.weights(p)
			w.total0 += w0
			w.totalMu += wMu
			if fails > 0 {
				w.sum0 += w0
				w.sumMu += wMu
			}
		}
	}
	return w
}

func (w *walk) weights(p place) (w0, wMu float64) {
	toy := w.sample.at(p)
	m := w.multiplicity[p.block]
	return m * toy.weight[0], m * toy.weight[1+w.node]
}

func (w *walk) done() bool { return w.place == len(w.sample.order[w.node]) }

// next goes on by one outcome, all toys tied with it; false at the end.
func (w *walk) next() bool {
	if w.done() {
		return false
	}
	order := w.sample.order[w.node]
	w.q = w.sample.at(order[w.place]).q[w.node]
	for !w.done() {
		p := order[w.place]
		if w.sample.at(p).q[w.node] < w.q-tie {
			break
		}
		w0, wMu := w.weights(p)
		w.sum0 += w0
		w.sumMu += wMu
		w.place++
	}
	return true
}

// cls is P(q̃ >= q|μ)/P(q̃ >= q|0) of the outcome reached.
func (w *walk) cls() float64 { return w.sumMu / w.totalMu / (w.sum0 / w.total0) }

// roots solves CLs = α for the five quantiles; NaN where the nodes do not bracket it.
func (s *jointSample) roots(alpha float64, outcomes [][5]outcome) (mu [5]float64) {
	cls := make([]float64, len(s.nodes))
	for i := range mu {
		for k := range s.nodes {
			cls[k] = outcomes[k][i].cls
		}
		mu[i] = crossing(s.nodes, cls, alpha)
	}
	return mu
}

// crossing interpolates where a curve of CLs over rising signal strengths falls
// to alpha: inverse quadratic in ln μ through the three nearest nodes, on the
// normal quantiles of CLs, in which it is nearly a line. Where noise makes those
// three rise, a line through two nodes has to do.
func crossing(nodes, cls []float64, alpha float64) float64 {
	var x, y []float64
	goal := stats.PhiInverse(alpha)
	for k, c := range cls {
		if v := stats.PhiInverse(c) - goal; !math.IsNaN(v) && !math.IsInf(v, 0) {
			x = append(x, math.Log(nodes[k]))
			y = append(y, v)
		}
	}
	if len(x) < 2 {
		return math.NaN()
	}
	// One node spacing beyond the ends is as far as a curve is continued.
	lowest, highest := x[0], x[len(x)-1]
	reach := (highest - lowest) / float64(len(x)-1)
	near := make([]int, len(x))
	for i := range near {
		near[i] = i
	}
	sort.SliceStable(near, func(i, j int) bool { return math.Abs(y[near[i]]) < math.Abs(y[near[j]]) })
	for points := min(3, len(x)); points >= 2; points-- {
		used := slices.Sorted(slices.Values(near[:points]))
		if logMu := inverse(x, y, used); logMu >= lowest-reach && logMu <= highest+reach {
			return math.Exp(logMu)
		}
	}
	// The first fall through zero.
	for i := 1; i < len(x); i++ {
		if y[i-1] >= 0 && y[i] < 0 {
			return math.Exp(inverse(x, y, []int{i - 1, i}))
		}
	}
	return math.NaN()
}

// inverse is the value at y = 0 of the polynomial x(y) through the points used
// (Lagrange, DLMF 3.3.1), NaN unless y falls from each to the next.
func inverse(x, y []float64, used []int) float64 {
	sum := 0.0
	for k, i := range used {
		if k > 0 && !(y[i] < y[used[k-1]]) {
			return math.NaN()
		}
		term := x[i]
		for _, j := range used {
			if j != i {
				term *= y[j] / (y[j] - y[i])
			}
		}
		sum += term
	}
	return sum
}

// replicas of a bootstrap: the error of a standard error is 1/sqrt(2·replicas).
const replicas = 200

// atom is the probability from which tied experiments count as one discrete
// outcome, and rare how often a resampled set may take another one before the
// quantile counts as lying on its edge: 2.6 standard errors, one-sided.
const (
	atom = 0.003
	rare = 0.005
)

// solve gives the limits of a sample with their errors, by a bootstrap over
// blocks (Efron, Ann. Stat. 7 (1979) 1), each of which holds all components in
// the same proportion. Failed fits, counted in every tail and in none, widen
// the errors.
func (r *runner) solve(s *jointSample, luminosity, alpha float64) (Exclusion, error) {
	best := s.outcomes(s.once(), 0)
	mu := s.roots(alpha, best)
	trusted := s.trusted(mu, best)
	most, least := mu, mu
	if s.failures() > 0 {
		most = s.roots(alpha, s.outcomes(s.once(), 1))
		least = s.roots(alpha, s.outcomes(s.once(), -1))
	}

	var again [replicas][5]float64
	var other [replicas][5]bool // another discrete outcome is at the quantile than the best one's
	if err := r.resample(limitToys, luminosity, len(s.blocks), func(replica int, multiplicity []float64) {
		outcomes := s.outcomes(multiplicity, 0)
		again[replica] = s.roots(alpha, outcomes)
		for i := range mu {
			k := nearest(s.nodes, mu[i])
			other[replica][i] = best[k][i].weight > atom && math.Abs(outcomes[k][i].q-best[k][i].q) > tie
		}
	}); err != nil {
		return Exclusion{}, err
	}

	var x Exclusion
	var errs, others [5]float64
	for i := range mu {
		others[i] = math.NaN()
		var same, different []float64
		for k := range again {
			switch {
			case math.IsNaN(again[k][i]):
			case other[k][i]:
				different = append(different, again[k][i])
			default:
				same = append(same, again[k][i])
			}
		}
		missing := replicas - len(same) - len(different)
		switch {
		case math.IsNaN(mu[i]):
			errs[i] = math.NaN()
			x.Why = "CLs does not reach the confidence level at the signal strengths tried"
			continue
		case !trusted[i]:
			mu[i], errs[i] = math.NaN(), math.NaN()
			x.Why = "a few toys carry a tail of the limit: more are needed"
			continue
		case math.IsNaN(most[i]) || math.IsNaN(least[i]):
			mu[i], errs[i] = math.NaN(), math.NaN()
			x.Why = "so many fits failed that they leave the limit open"
			continue
		case missing > replicas/10:
			mu[i], errs[i] = math.NaN(), math.NaN()
			x.Why = fmt.Sprintf("too few toys: %d of %d resampled sets give no limit", missing, replicas)
			continue
		}
		errs[i] = deviation(same)
		if float64(len(different)) > rare*replicas {
			slices.Sort(different)
			other := different[len(different)/2]
			// Steps within the error are part of it.
			if math.Abs(other-mu[i]) > 3*errs[i] {
				others[i] = other
			} else {
				errs[i] = deviation(append(same, different...))
			}
		}
		errs[i] += math.Abs(most[i]-least[i]) / 2
	}
	x.MuUp, x.MuUpError, x.MuUpOther = band(mu), band(errs), band(others)
	return x, nil
}

// trusted tells which limits rest on enough toys: those in both tails of CLs at
// the node nearest to each.
func (s *jointSample) trusted(mu [5]float64, best [][5]outcome) (ok [5]bool) {
	const largest = 0.1 // share of one toy
	for i := range mu {
		if math.IsNaN(mu[i]) {
			continue
		}
		k := nearest(s.nodes, mu[i])
		var sum, squares, heaviest [2]float64
		for _, p := range s.order[k] {
			toy := s.at(p)
			if toy.q[k] < best[k][i].q-tie {
				break
			}
			for h, w := range [2]float64{toy.weight[0], toy.weight[1+k]} {
				sum[h] += w
				squares[h] += w * w
				heaviest[h] = math.Max(heaviest[h], w)
			}
		}
		ok[i] = true
		for h := range sum {
			ok[i] = ok[i] && sum[h]*sum[h] >= 2*fewest*squares[h] && heaviest[h] <= largest*sum[h]
		}
	}
	return ok
}

// nearest is the node nearest to mu in ratio.
func nearest(nodes []float64, mu float64) int {
	best := 0
	for k, node := range nodes {
		if math.Abs(math.Log(node/mu)) < math.Abs(math.Log(nodes[best]/mu)) {
			best = k
		}
	}
	return best
}

// deviation is the standard deviation of a sample.
func deviation(v []float64) float64 {
	if len(v) < 2 {
		return math.NaN()
	}
	return stat.StdDev(v, nil)
}
