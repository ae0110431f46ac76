package toys

import (
	"fmt"
	"math"
	"sort"

	"lumireach/stats"
)

// outcomes are all experiments of one or two counts that matter, with at most
// one auxiliary measurement, and their probabilities under some signal
// strengths.
type outcomes struct {
	engine *stats.Engine
	fitter *stats.Fitter
	data   stats.Data
	counts [][2]float64
	p      [][]float64  // by hypothesis and row: of the counts
	a      []float64    // auxiliary values at which a statistic is tabulated; {0} where there is none
	step   float64      // between them, in standard deviations
	free   []*stats.Fit // by row and a, made when first wanted
}

// mostOutcomes are what is enumerated at most, rows times auxiliary values.
const mostOutcomes = 1_000_000

// enumerable tells whether a search has exact answers: one or two counts with at
// most one uncertainty, in experiments with fixed nuisance parameters.
func enumerable(e *stats.Engine, c Config) bool {
	return !c.WithoutExact && c.Nuisances == Fixed && e.Bins() <= 2 && e.Factors() == 0 && e.Auxiliary() <= 1
}

// newOutcomes enumerates the counts of probability above least under any of the
// hypotheses, with auxiliary values up to reach.
func newOutcomes(e *stats.Engine, mus []float64, least, reach, step float64) (*outcomes, error) {
	o := &outcomes{engine: e, fitter: e.Fitter(), a: []float64{0}, step: step, p: make([][]float64, len(mus))}
	o.data = stats.Data{N: make([]float64, e.Bins()), A: make([]float64, e.Auxiliary())}
	if e.Auxiliary() > 0 {
		o.a = nil
		for a := -reach; a <= reach; a += step {
			o.a = append(o.a, a)
		}
	}
	var low, high [2]int
	var probability [2][][]float64 // by bin, hypothesis and count from low
	for bin := range e.Bins() {
		low[bin], high[bin] = math.MaxInt, 0
		var means []float64
		for _, mu := range mus {
			mean := e.Point(mu, nil).Lambda[bin]
			means = append(means, mean)
			first, last := countRange(mean, least)
			low[bin], high[bin] = min(low[bin], first), max(high[bin], last)
		}
		for _, mean := range means {
			var p []float64
			for n := low[bin]; n <= high[bin]; n++ {
				p = append(p, math.Exp(stats.LogPoisson(n, mean)))
			}
			probability[bin] = append(probability[bin], p)
		}
	}
	if e.Bins() == 1 {
		probability[1] = make([][]float64, len(mus))
		for h := range mus {
			probability[1][h] = []float64{1}
		}
	}
	p := make([]float64, len(mus))
	for n := low[0]; n <= high[0]; n++ {
		for m := low[1]; m <= high[1]; m++ {
			matters := false
			for h := range mus {
				p[h] = probability[0][h][n-low[0]] * probability[1][h][m-low[1]]
				matters = matters || p[h] > least
			}
			if !matters {
				continue
			}
			o.counts = append(o.counts, [2]float64{float64(n), float64(m)})
			for h := range mus {
				o.p[h] = append(o.p[h], p[h])
			}
			if len(o.counts)*len(o.a) > mostOutcomes {
				return nil, fmt.Errorf("more than %d outcomes matter: exact sums are for fewer events", mostOutcomes)
			}
		}
	}
	return o, nil
}

// countRange is the counts of a mean beyond which less than least remains on
// either side.
func countRange(mean, least float64) (first, last int) {
	width := math.Sqrt(mean) + 1
	first, last = int(mean), int(mean)
	for step := int(width); first > 0 && stats.PoissonAtMost(first-1, mean) > least; {
		first = max(0, first-max(1, step/2))
	}
	for step := int(width); stats.PoissonAtLeast(last+1, mean) > least; {
		last += max(1, step/2)
	}
	return first, last
}

// set makes an outcome the data.
func (o *outcomes) set(row int, a float64) *stats.Data {
	for bin := range o.data.N {
		o.data.N[bin] = o.counts[row][bin]
	}
	for i := range o.data.A {
		o.data.A[i] = a
	}
	return &o.data
}

// q0 tabulates the discovery statistic.
func (o *outcomes) q0() (*table, error) {
	return o.tabulate(func(row int, a float64, _ int) (float64, stats.Status) {
		return o.fitter.Q0(o.set(row, a), 0)
	})
}

// qTilde tabulates the upper-limit statistic at mu.
func (o *outcomes) qTilde(mu float64) (*table, error) {
	if o.free == nil {
		o.free = make([]*stats.Fit, len(o.counts)*len(o.a))
	}
	return o.tabulate(func(row int, a float64, k int) (float64, stats.Status) {
		d := o.set(row, a)
		if k < 0 {
			return o.fitter.QTilde(d, mu, o.fitter.Free(d, 0, math.Inf(1)))
		}
		free := &o.free[row*len(o.a)+k]
		if *free == nil {
			fit := o.fitter.Free(d, 0, math.Inf(1))
			*free = &fit
		} else {
			o.fitter.Restart(d, **free)
		}
		return o.fitter.QTilde(d, mu, **free)
	})
}

// table is one statistic of all outcomes.
type table struct {
	*outcomes
	root   []float64 // of the statistic, by row and a
	at     func(row int, a float64, k int) (float64, stats.Status)
	order  []int       // rows in falling order, where there is no auxiliary value
	sums   [][]float64 // by hypothesis: probability of order[:i]
	failed error
}

func (o *outcomes) tabulate(statistic func(row int, a float64, k int) (float64, stats.Status)) (*table, error) {
	t := &table{outcomes: o, root: make([]float64, len(o.counts)*len(o.a)), at: statistic}
	for _, column := range o.columns() {
		if err := t.fill(column); err != nil {
			return nil, err
		}
	}
	if len(o.a) > 1 {
		return t, nil
	}
	t.order = make([]int, len(o.counts))
	for i := range t.order {
		t.order[i] = i
	}
	sort.SliceStable(t.order, func(i, j int) bool { return t.root[t.order[i]] > t.root[t.order[j]] })
	for _, p := range o.p {
		sums := make([]float64, 1, len(p)+1)
		for _, row := range t.order {
			sums = append(sums, sums[len(sums)-1]+p[row])
		}
		t.sums = append(t.sums, sums)
	}
	return t, nil
}

// columns are the rows of one second count each, in rising order of the first.
func (o *outcomes) columns() [][]int {
	place := map[float64]int{}
	var out [][]int
	for row, n := range o.counts {
		k, known := place[n[1]]
		if !known {
			k = len(out)
			place[n[1]] = k
			out = append(out, nil)
		}
		out[k] = append(out[k], row)
	}
	return out
}

// fill tabulates one column. The root of a statistic is nearly a line in the
// count: where counts lie close on the scale of their fluctuation, some are
// fitted and those between interpolated by a cubic, unless the statistic is cut at
// zero nearby.
func (t *table) fill(column []int) error {
	fit := func(row int) error {
		for k, a := range t.a {
			q, status := t.at(row, a, k)
			if err := status.Err(); err != nil {
				return fmt.Errorf("counts %v: %w", t.data.N, err)
			}
			t.root[row*len(t.a)+k] = math.Sqrt(q)
		}
		return nil
	}
	const part = 0.25 // of a standard deviation of the count
	stride := max(1, int(part*math.Sqrt(t.counts[column[len(column)/2]][0])))
	if len(t.a) > 1 || len(t.data.N) == 1 {
		stride = 1
	}
	var anchors []int
	for i := 0; i < len(column); i += stride {
		anchors = append(anchors, i)
	}
	if last := len(column) - 1; anchors[len(anchors)-1] != last {
		anchors = append(anchors, last)
	}
	for _, i := range anchors {
		if err := fit(column[i]); err != nil {
			return err
		}
	}
	for k := 0; k+1 < len(anchors); k++ {
		for i := anchors[k] + 1; i < anchors[k+1]; i++ {
			if value, ok := t.interpolate(column, anchors[max(0, k-1):min(len(anchors), k+3)], i); ok {
				t.root[column[i]] = value
			} else if err := fit(column[i]); err != nil {
				return err
			}
		}
	}
	return nil
}

// interpolate is the cubic through four fitted places of a column (Lagrange, DLMF
// 3.3); ok is false where there are fewer or one is cut at zero.
func (t *table) interpolate(column, near []int, place int) (value float64, ok bool) {
	if len(near) < 4 {
		return 0, false
	}
	x := t.counts[column[place]][0]
	for _, j := range near {
		term := t.root[column[j]]
		if term == 0 {
			return 0, false
		}
		for _, k := range near {
			if k != j {
				xj, xk := t.counts[column[j]][0], t.counts[column[k]][0]
				term *= (x - xk) / (xj - xk)
			}
		}
		value += term
	}
	return value, true
}

// tied is how close roots of a statistic count as equal: its values are good to
// tie.
func tied(root float64) float64 { return tie / math.Max(root, math.Sqrt(tie)) }

// atLeast is the probability, under hypothesis h, of a statistic whose root is at
// least this; with exact set, edges in the auxiliary value are placed by fits,
// else by interpolation.
func (t *table) atLeast(root float64, h int, exact bool) float64 {
	root -= tied(root)
	if t.order != nil {
		n := sort.Search(len(t.order), func(i int) bool { return t.root[t.order[i]] < root })
		return t.sums[h][n]
	}
	sum := 0.0
	for row := range t.counts {
		if p := t.p[h][row]; p > 0 {
			sum += p * t.measure(row, root, exact)
		}
	}
	return sum
}

// measure is the probability of auxiliary values at which row's statistic has
// at least this root. What lies beyond the table counts as its ends.
func (t *table) measure(row int, root float64, exact bool) float64 {
	n := len(t.a)
	values := t.root[row*n : (row+1)*n]
	sum := 0.0
	begin := math.Inf(-1)
	inside := values[0] >= root
	for k := 1; k < n; k++ {
		if (values[k] >= root) == inside {
			continue
		}
		edge := t.edge(row, k-1, root, exact)
		if inside {
			sum += between(begin, edge)
		}
		inside, begin = !inside, edge
	}
	if inside {
		sum += between(begin, math.Inf(1))
	}
	return sum
}

// between is the probability of a unit normal from low to high, by the tail
// that they lie in.
func between(low, high float64) float64 {
	if low > 0 {
		return stats.PValue(low) - stats.PValue(high)
	}
	return stats.Phi(high) - stats.Phi(low)
}

// edge is where the root of row's statistic passes a value between the
// tabulated auxiliary values k and k+1: by the cubic through four of them, or
// straight where the statistic is cut at zero, and then one step with a fit.
func (t *table) edge(row, k int, root float64, exact bool) float64 {
	n := len(t.a)
	values := t.root[row*n : (row+1)*n]
	slope := (values[k+1] - values[k]) / t.step
	at := func(a float64) float64 {
		x := (a - t.a[k]) / t.step
		if k == 0 || k+2 >= n || values[k-1] == 0 || values[k] == 0 || values[k+1] == 0 || values[k+2] == 0 {
			return values[k] + x*(values[k+1]-values[k])
		}
		// Lagrange's form, DLMF 3.3.
		return -values[k-1]*x*(x-1)*(x-2)/6 + values[k]*(x+1)*(x-1)*(x-2)/2 -
			values[k+1]*(x+1)*x*(x-2)/2 + values[k+2]*(x+1)*x*(x-1)/6
	}
	a := t.a[k] + (root-values[k])/slope
	for range 3 {
		a = math.Max(t.a[k], math.Min(t.a[k+1], a-(at(a)-root)/slope))
	}
	if !exact {
		return a
	}
	for range 3 {
		q, status := t.at(row, a, -1)
		if err := status.Err(); err != nil {
			t.failed = err
			return a
		}
		step := (math.Sqrt(q) - root) / slope
		a = math.Max(t.a[k], math.Min(t.a[k+1], a-step))
		if math.Abs(step) < 1e-9 {
			break
		}
	}
	return a
}

// upper is the root of the statistic that is reached with probability p under
// hypothesis h: the largest with P(statistic >= it) >= p.
func (t *table) upper(p float64, h int) float64 {
	if t.order != nil {
		n := sort.Search(len(t.order), func(i int) bool { return t.sums[h][i+1] >= p })
		if n == len(t.order) {
			n--
		}
		return t.root[t.order[n]]
	}
	low, high := 0.0, 0.0
	for _, v := range t.root {
		high = math.Max(high, v)
	}
	for high-low > 1e-11*(1+high) {
		middle := (low + high) / 2
		if t.atLeast(middle, h, false) >= p {
			low = middle
		} else {
			high = middle
		}
	}
	return low
}

// within is the smallest root that is reached with probability of at most p
// under hypothesis h, +Inf where none is.
func (t *table) within(p float64, h int) float64 {
	if t.order != nil {
		// Ties at the edge are in or out together.
		root := math.Inf(1)
		for i, row := range t.order {
			last := i+1 == len(t.order) || t.root[t.order[i+1]] < t.root[row]-tied(t.root[row])
			if t.sums[h][i+1] > p {
				break
			}
			if last {
				root = t.root[row]
			}
		}
		return root
	}
	return t.upper(p, h)
}
