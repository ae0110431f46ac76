package toys

import (
	"math"
	"sort"

	"lumireach/stats"
)

// tie is how close two values of a test statistic count as equal: fits are
// good to better than this.
const tie = 1e-6

// weighted is one toy of a sample thrown from a mixture.
type weighted struct {
	q, w      float64 // q is NaN where a fit failed
	component int
	block     int
}

// sample is toys of a mixture.
type sample struct {
	toys   []weighted
	thrown []int // by component
	blocks int
}

// ranked is a sample of one hypothesis in rising order of q.
type ranked struct {
	toys   []weighted
	failed int // left out of toys
	blocks int
}

func rank(s sample) *ranked {
	r := &ranked{blocks: s.blocks}
	for _, toy := range s.toys {
		if math.IsNaN(toy.q) {
			r.failed++
		} else {
			r.toys = append(r.toys, toy)
		}
	}
	sort.SliceStable(r.toys, func(i, j int) bool { return r.toys[i].q < r.toys[j].q })
	return r
}

// quantile is the smallest q with P(q0 <= q) >= u.
func (r *ranked) quantile(u float64) float64 {
	return r.toys[stats.QuantileIndex(len(r.toys), u)].q
}

// resampled is quantile with the blocks weighted as given.
func (r *ranked) resampled(u float64, multiplicity []float64) float64 {
	total := 0.0
	for _, toy := range r.toys {
		total += multiplicity[toy.block]
	}
	goal, sum := u*total*(1-1e-12), 0.0
	for _, toy := range r.toys {
		if sum += multiplicity[toy.block]; sum >= goal && sum > 0 {
			return toy.q
		}
	}
	return math.NaN()
}

// tail is the upper tail P(q0 >= q) of a hypothesis, from toys of a mixture
// weighted to it. Fits that failed are not among its toys, nor lost: their
// weight stands apart as a bound.
type tail struct {
	toys    []weighted // in falling order of q
	sums    []float64  // sums[i] is the weight of toys[:i]
	thrown  []int      // by component, failed fits included
	total   int
	blocks  int
	failed  float64 // weight of failed fits
	failing int
}

func newTail(s sample) *tail {
	t := &tail{thrown: s.thrown, blocks: s.blocks}
	for _, n := range s.thrown {
		t.total += n
	}
	for _, toy := range s.toys {
		if math.IsNaN(toy.q) {
			t.failed += toy.w
			t.failing++
			continue
		}
		t.toys = append(t.toys, toy)
	}
	sort.SliceStable(t.toys, func(i, j int) bool { return t.toys[i].q > t.toys[j].q })
	t.sums = make([]float64, len(t.toys)+1)
	for i, toy := range t.toys {
		t.sums[i+1] = t.sums[i] + toy.w
	}
	return t
}

// within is how many toys have q0 >= q, ties included.
func (t *tail) within(q float64) int {
	return sort.Search(len(t.toys), func(i int) bool { return t.toys[i].q < q-tie })
}

// estimate is a probability from weighted toys.
type estimate struct {
	p, err    float64 // err covers failed fits counted either way
	passing   int
	effective float64 // (Σw)²/Σw² of the toys that pass
	share     float64 // of the largest of their weights
}

// p estimates P(q0 >= q). Its error is the variance within components, for the
// number of toys of each is fixed (Owen & Zhou, J. Am. Stat. Assoc. 95 (2000)
// 135, section 2).
func (t *tail) p(q float64) estimate {
	return t.first(t.within(q))
}

// first estimates the probability of the first n toys of the tail.
func (t *tail) first(n int) estimate {
	e := estimate{passing: n}
	sum := make([]float64, len(t.thrown))
	squares := make([]float64, len(t.thrown))
	largest, all, allSquares := 0.0, 0.0, 0.0
	for _, toy := range t.toys[:n] {
		sum[toy.component] += toy.w
		squares[toy.component] += toy.w * toy.w
		largest = math.Max(largest, toy.w)
		all += toy.w
		allSquares += toy.w * toy.w
	}
	total := float64(t.total)
	e.p = all / total
	variance := 0.0
	for k, thrown := range t.thrown {
		n := float64(thrown)
		mean := sum[k] / n
		variance += math.Max(0, squares[k]-mean*sum[k]) * n / (n - 1)
	}
	e.err = math.Sqrt(variance)/total + t.failed/total
	if n > 0 {
		e.effective = all * all / allSquares
		e.share = largest / all
	}
	return e
}

// resampled is p(q) with the blocks weighted as given.
func (t *tail) resampled(q float64, multiplicity []float64) float64 {
	sum := 0.0
	for _, toy := range t.toys[:t.within(q)] {
		sum += multiplicity[toy.block] * toy.w
	}
	return sum / float64(t.total)
}

// A tail probability is given as a number only from so many effective toys, of
// weighted ones only if they are half a hundredth of all, and only if no toy carries
// more than largestShare of it: a mixture that misses the likely way into a tail
// betrays itself by these.
const (
	fewest         = 10
	largestShare   = 0.05
	effectiveShare = 0.005
)

func (t *tail) trusts(e estimate) bool {
	if e.effective < fewest {
		return false
	}
	return len(t.thrown) == 1 || e.effective >= effectiveShare*float64(t.total) && e.share <= largestShare
}

// trustsAll tells whether every tail P(q0 >= q) of those given is trusted.
func (t *tail) trustsAll(qs []float64) bool {
	for _, q := range qs {
		if q > tie && !t.trusts(t.p(q)) {
			return false
		}
	}
	return true
}

// z turns an observed q0 into a significance by the toys, cut at 0. ok tells
// that the toys reach so far.
func (t *tail) z(q float64) (z, err float64, ok bool) {
	if q <= tie {
		return 0, 0, true // p = 1
	}
	e := t.p(q)
	if !t.trusts(e) {
		return math.NaN(), 0, false
	}
	z = stats.Significance(math.Min(e.p, 1))
	// dz = dp/φ(z).
	err = e.err / density(z)
	if z < 0 {
		return 0, math.Max(0, z+err), true
	}
	return z, err, true
}

// density is the standard normal density.
func density(z float64) float64 { return math.Exp(-z*z/2) / math.Sqrt(2*math.Pi) }

// threshold is the q0 above which, not at which, p is at most the probability
// given. ok tells that the toys reach so far.
func (t *tail) threshold(probability float64) (q float64, ok bool) {
	total := float64(t.total)
	n := sort.Search(len(t.sums), func(i int) bool { return t.sums[i] > probability*total }) - 1
	for n > 0 && n < len(t.toys) && t.toys[n].q >= t.toys[n-1].q-tie {
		n-- // ties stand on the same side
	}
	if n >= len(t.toys) {
		return math.Inf(-1), true
	}
	return t.toys[n].q, n > 0 && t.trusts(t.first(n))
}

// around is values of q0 on either side of threshold: a tail that is surely more
// than the probability given and one that is surely less. What is told by many
// standard errors needs fewer toys than a number does.
func (t *tail) around(probability float64) (lower, upper float64) {
	const (
		least = 5    // effective toys
		most  = 0.35 // share of one toy
		sure  = 5    // standard errors
	)
	holds := func(e estimate, sign float64) bool {
		return e.effective >= least && e.share <= most && sign*(e.p-probability) >= sure*e.err
	}
	n := sort.Search(len(t.sums), func(i int) bool { return t.sums[i] > probability*float64(t.total) })
	lower, upper = math.Inf(-1), math.Inf(1)
	for more := n; more < len(t.toys); more = max(more+1, int(float64(more)/scanRatio)) {
		if more > 0 && holds(t.first(more), 1) {
			lower = t.toys[more-1].q
			break
		}
	}
	for less := n - 1; less > 0; less = min(less-1, int(scanRatio*float64(less))) {
		if holds(t.first(less), -1) {
			upper = t.toys[less-1].q
			break
		}
	}
	return lower, upper
}

// scanRatio is the ratio of the numbers of toys in neighbouring tails where a
// tail is scanned for trust.
const scanRatio = 0.93

// reach describes how far the toys go: the largest significance up to which
// they are trusted with every tail.
func (t *tail) reach() *Tail {
	r := &Tail{}
	for n := len(t.toys); n > 0; n = min(n-1, int(scanRatio*float64(n))) {
		e := t.first(n)
		if !t.trusts(e) {
			break
		}
		r.EffectiveToys, r.LargestShare = e.effective, e.share
		r.ReachesZ = math.Max(0, stats.Significance(math.Min(1, e.p)))
	}
	return r
}

// atLeast is a lower bound of the significance of q: that of the smallest trusted
// tail that holds it.
func (t *tail) atLeast(q float64) float64 {
	for n := max(1, t.within(q)); n <= len(t.toys); n = max(n+1, int(float64(n)/scanRatio)) {
		if e := t.first(n); t.trusts(e) {
			return math.Max(0, stats.Significance(math.Min(1, e.p)))
		}
	}
	return 0
}
