package toys

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/floats"

	"lumireach/stats"
)

// Auxiliary measurements fluctuate: with a background known to 1 % and 10⁶
// events, q0 of background-only toys follows the half χ² only if they do.
func TestAuxiliaryFluctuates(t *testing.T) {
	const (
		k    = 4.5 // standard errors; right code fails for 1 seed in 150000
		toys = 20000
	)
	r := testRunner(t, Config{Seed: 19})
	e := engine(t, uncertain(3e4, 1e6, 0.01), 1)
	s, err := r.throw(e, 1, nullToys, []proposal{{Point: e.Point(0, nil), toys: toys}})
	if err != nil {
		t.Fatal(err)
	}
	want := stats.PValue(1)
	if got, se := newTail(s).p(1).p, math.Sqrt(want*(1-want)/toys); math.Abs(got-want) > k*se {
		t.Errorf("P(q0 >= 1) = %v, want %v ± %v (seed 19)", got, want, se)
	}
}

// The z of toys is the p-value of the toy null, not sqrt(q0): doubling the
// null's weights doubles every p-value.
func TestSignificanceFromNull(t *testing.T) {
	r := testRunner(t, Config{Toys: 4000, Seed: 23})
	e := engine(t, onOff(10, 20, 2), 3)
	signal, err := r.signal(e, 3, 4000)
	if err != nil {
		t.Fatal(err)
	}
	null, err := r.null(e, 3, span{1, 5}, 4000, nil)
	if err != nil {
		t.Fatal(err)
	}
	single := summarise(signal, null)
	for i := range null.toys {
		null.toys[i].w *= 2
	}
	for i := range null.sums {
		null.sums[i] *= 2
	}
	double := summarise(signal, null)
	for i, u := range quantiles {
		p := null.p(signal.quantile(u)).p / 2
		before, after := single.Z.list()[i], double.Z.list()[i]
		if want := math.Max(0, stats.Significance(p)); math.Abs(before-want) > 1e-12 {
			t.Errorf("quantile %v: z = %v, want %v", u, before, want)
		}
		if want := math.Max(0, stats.Significance(math.Min(1, 2*p))); math.Abs(after-want) > 1e-12 {
			t.Errorf("quantile %v with doubled weights: z = %v, want %v", u, after, want)
		}
	}
}

// The 95 % CLs limit covers the true μ at least as often as promised: q̃ at the
// true μ of signal-plus-background toys against distributions of q̃ under μ and
// under 0 that are thrown independently.
func TestCoverage(t *testing.T) {
	experiments, each := 2000, 4000
	if testing.Short() {
		experiments, each = 300, 800
	}
	r := testRunner(t, Config{Seed: 29})
	e := engine(t, scenario(t, "window"), 1)
	limit, err := e.ExpectedLimit(0, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	mu := 1.5 * limit
	throw := func(use purpose, strength float64, toys int) []float64 {
		m := mixtureOf(t, []proposal{{Point: e.Point(strength, nil), near: strength, toys: toys}})
		starts := m.blockStarts()
		out := make([]float64, toys)
		blocks := len(starts) - 1
		err := r.run(e, 1, blocks, func(w *worker, block int) {
			w.stream.restart(key{31, use, strength, 0, block})
			for i := starts[block]; i < starts[block+1]; i++ {
				m.throw(w, 0)
				q, status := w.fit.QTilde(&w.data, mu, w.fit.Free(&w.data, strength, math.Inf(1)))
				if status != stats.Converged {
					t.Errorf("toy %d of μ = %v: %v", i, strength, status.Err())
				}
				out[i] = q
			}
		})
		if err != nil {
			t.Fatal(err)
		}
		return out
	}
	under, without := throw(signalToys, mu, each), throw(nullToys, 0, each)
	above := func(sample []float64, q float64) float64 {
		n := 0
		for _, v := range sample {
			if v >= q-tie {
				n++
			}
		}
		return float64(n) / float64(len(sample))
	}
	covered := 0
	for _, q := range throw(limitToys, mu, experiments) {
		if above(under, q)/above(without, q) > 0.05 {
			covered++
		}
	}
	coverage := float64(covered) / float64(experiments)
	// The distributions' own error counts too; 4.5 standard errors, 1 seed in 150000.
	se := math.Sqrt(0.95 * 0.05 * (1/float64(experiments) + 1/float64(each)))
	t.Logf("coverage of μ = %.3g: %.4f ± %.4f", mu, coverage, se)
	if coverage < 0.95-4.5*se {
		t.Errorf("coverage = %v, want at least 0.95 ± %v (seed 31)", coverage, se)
	}
}

// clumsy is a fitter that fails at every hundredth q0 and q̃.
type clumsy struct {
	fitter
	calls *int
}

func (c clumsy) fails() bool {
	*c.calls++
	return *c.calls%100 == 0
}

func (c clumsy) Q0(d *stats.Data, near float64) (float64, stats.Status) {
	if c.fails() {
		return math.NaN(), stats.Failed
	}
	return c.fitter.Q0(d, near)
}

func (c clumsy) QTilde(d *stats.Data, mu float64, free stats.Fit) (float64, stats.Status) {
	if c.fails() {
		return math.NaN(), stats.Failed
	}
	return c.fitter.QTilde(d, mu, free)
}

// Fits that fail are counted, widen the errors and are warned of.
func TestFailedFits(t *testing.T) {
	config := Config{WithoutExact: true, Luminosities: []float64{3}, Toys: 2000, Seed: 37, Workers: 1}
	run := func(broken bool) *ReachResult {
		r := testRunner(t, config)
		if broken {
			calls := 0
			r.newFitter = func(e *stats.Engine) fitter { return clumsy{e.Fitter(), &calls} }
		}
		result, err := reach(r, onOff(10, 20, 2))
		if err != nil {
			t.Fatal(err)
		}
		return result
	}
	good, bad := run(false), run(true)
	if text := strings.Join(good.Cautions, "\n"); strings.Contains(text, "failed") {
		t.Errorf("failures told where there are none: %s", text)
	}
	a, b := good.Points[0].Toys, bad.Points[0].Toys
	if a.Discovery.FailedFits != 0 || a.Exclusion.FailedFits != 0 {
		t.Errorf("failed fits of a good fitter: %d and %d", a.Discovery.FailedFits, a.Exclusion.FailedFits)
	}
	if n := b.Discovery.FailedFits; n < 30 || n > 50 { // 40 of 4000
		t.Errorf("%d failed fits of 4000, want about 40", n)
	}
	if b.Exclusion.FailedFits < 50 {
		t.Errorf("%d failed fits of limits, want above 50", b.Exclusion.FailedFits)
	}
	if !(b.Discovery.ZError.Median > a.Discovery.ZError.Median) {
		t.Errorf("error of the median Z is %v with failures, %v without: not wider", b.Discovery.ZError.Median, a.Discovery.ZError.Median)
	}
	if narrow, wide := a.Exclusion.MuUpError.list(), b.Exclusion.MuUpError.list(); !(floats.Sum(wide[:]) > floats.Sum(narrow[:])) {
		t.Errorf("errors of the limits are %v with failures, %v without: not wider", b.Exclusion.MuUpError, a.Exclusion.MuUpError)
	}
	if text := strings.Join(bad.Cautions, "\n"); !strings.Contains(text, "Warning: more than 1 in 1000 fits failed") {
		t.Errorf("no warning of failed fits: %s", text)
	}
	for k, g := range bad.Goals {
		if g.Toys.FailedFits == 0 {
			t.Errorf("goal %s counts no failed fit", g.Name)
		}
		// Failures of 1 in 100 can leave a luminosity open altogether.
		if !(g.Toys.Error > good.Goals[k].Toys.Error) && g.Toys.Why == "" {
			t.Errorf("error of goal %s is %v with failures, %v without: not wider", g.Name, g.Toys.Error, good.Goals[k].Toys.Error)
		}
	}
}

// pointText writes one point out in full.
func pointText(p Point) string {
	d := p.Toys.Discovery
	d.Tail = nil
	return fmt.Sprintf("%v %v %v %v %v", p.Luminosity, p.Formula, d, p.Toys.Exclusion, *p.Toys.Discovery.Tail)
}

// The number of workers changes no bit; a longer list of luminosities changes no
// old row and no goal.
func TestReproducible(t *testing.T) {
	search := onOff(25, 150, 2)
	run := func(workers int, luminosities ...float64) *ReachResult {
		r, err := Reach(context.Background(), search, Config{WithoutExact: true, Luminosities: luminosities, Toys: 600, Seed: 41, Workers: workers})
		if err != nil {
			t.Fatal(err)
		}
		return r
	}
	goalText := func(g Goal) string {
		g.Toys.BeyondList = false // the one thing that is of the list
		return fmt.Sprint(*g.Toys)
	}
	one := run(1, 1, 3)
	for _, workers := range []int{2, 7} {
		many := run(workers, 1, 3)
		for k := range one.Points {
			if got, want := pointText(many.Points[k]), pointText(one.Points[k]); got != want {
				t.Errorf("%d workers give\n%s\none gives\n%s", workers, got, want)
			}
		}
		for k := range one.Goals {
			if got, want := goalText(many.Goals[k]), goalText(one.Goals[k]); got != want {
				t.Errorf("%d workers give the goal %s, one gives %s", workers, got, want)
			}
		}
	}
	longer := run(2, 0.5, 1, 2, 3)
	if got, want := pointText(longer.Points[1]), pointText(one.Points[0]); got != want {
		t.Errorf("in a longer list luminosity 1 gives\n%s\nin a shorter one\n%s", got, want)
	}
	for k := range one.Goals {
		if got, want := goalText(longer.Goals[k]), goalText(one.Goals[k]); got != want {
			t.Errorf("a longer list gives the goal %s, a shorter one %s", got, want)
		}
	}

	window := scenario(t, "window")
	var texts []string
	for _, workers := range []int{1, 2, 7} {
		r := testRunner(t, Config{Toys: 400, Seed: 41, Workers: workers})
		e := engine(t, window, 2)
		formula, err := formulas(e, r.config)
		if err != nil {
			t.Fatal(err)
		}
		d, err := r.discover(e, 2, formula.Discovery.Z)
		if err != nil {
			t.Fatal(err)
		}
		x, err := r.limits(e, 2, formula.Exclusion.MuUp)
		if err != nil {
			t.Fatal(err)
		}
		texts = append(texts, pointText(Point{Toys: &Answer{d, x}}))
	}
	if texts[1] != texts[0] || texts[2] != texts[0] {
		t.Errorf("1, 2 and 7 workers give\n%s", strings.Join(texts, "\n"))
	}
	search = window
	other := testRunner(t, Config{Toys: 200, Seed: 42})
	signal, err := other.signal(engine(t, search, 1), 1, 200)
	if err != nil {
		t.Fatal(err)
	}
	same := testRunner(t, Config{Toys: 200, Seed: 41})
	if again, err := same.signal(engine(t, search, 1), 1, 200); err != nil || again.quantile(0.5) == signal.quantile(0.5) {
		t.Errorf("another seed gives the same toys, or %v", err)
	}
}

// The first numbers of a stream are frozen: a change of them changes every
// published result of a seed.
func TestStreamFrozen(t *testing.T) {
	s := newStream()
	s.restart(key{seed: 1, purpose: signalToys, luminosity: 10, component: 2, block: 3})
	got := []uint64{s.Uint64(), s.Uint64(), s.Uint64()}
	want := []uint64{0xba4ae3c8df7f6651, 0x8120fd1b4ab81196, 0xca3fd0500effc74d}
	if fmt.Sprint(got) != fmt.Sprint(want) {
		t.Errorf("the stream begins with %#x, want %#x", got, want)
	}
	for _, k := range []key{
		{2, signalToys, 10, 2, 3}, {1, nullToys, 10, 2, 3}, {1, signalToys, 11, 2, 3}, {1, signalToys, 10, 1, 3}, {1, signalToys, 10, 2, 4},
	} {
		s.restart(k)
		if s.Uint64() == got[0] {
			t.Errorf("key %+v gives the stream of another", k)
		}
	}
}

// A cancelled run ends with the context's error and no result.
func TestCancel(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	calls := 0
	_, err := Reach(ctx, scenario(t, "window"), Config{
		Luminosities: []float64{1}, Toys: 100000,
		Progress: func(Progress) {
			if calls++; calls == 10 {
				cancel()
			}
		},
	})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("a cancelled run ends with %v", err)
	}
}

// Without background one event decides: no significance, but its chance; limits
// of 3.00 events at 95 %.
func TestNoBackground(t *testing.T) {
	r, err := Reach(context.Background(), count(2, 0), Config{WithoutExact: true, Luminosities: []float64{1}, Toys: 2000, Seed: 43})
	if err != nil {
		t.Fatal(err)
	}
	for name, d := range map[string]Discovery{"formula": r.Points[0].Formula.Discovery, "toys": r.Points[0].Toys.Discovery} {
		if !math.IsNaN(d.Z.Median) || d.Why == "" {
			t.Errorf("%s: Z = %v, why %q; want none and a reason", name, d.Z.Median, d.Why)
		}
		if want := 1 - math.Exp(-2); math.Abs(d.ChanceOne-want) > 1e-12 {
			t.Errorf("%s: chance of an event is %v, want %v", name, d.ChanceOne, want)
		}
	}
	x := r.Points[0].Toys.Exclusion
	for i, mu := range x.MuUp.list() {
		if want := -math.Log(0.05) / 2; !(math.Abs(mu-want) <= 4.5*x.MuUpError.list()[i]) {
			t.Errorf("limit %d is %v ± %v, want %v (seed 43)", i, mu, x.MuUpError.list()[i], want)
		}
	}
	for _, g := range r.Goals {
		if g.Name != "exclusion" && (!math.IsNaN(g.Formula.Luminosity) || g.Formula.Why == "" || g.Toys.Why == "") {
			t.Errorf("%s: %v, why %q, %q; want none and reasons", g.Name, g.Formula.Luminosity, g.Formula.Why, g.Toys.Why)
		}
	}
}

// A loop over toys allocates nothing.
func TestToysAllocateNothing(t *testing.T) {
	e := engine(t, scenario(t, "window"), 1)
	m := mixtureOf(t, []proposal{{Point: e.Point(0, nil), toys: 1}, {Point: e.Point(1, nil), toys: 1}})
	f := e.Fitter()
	w := testWorker(e, 1)
	if a := testing.AllocsPerRun(20, func() {
		m.throw(w, 1)
		m.logDensities(w)
		m.balance(w.logs)
		f.Q0(&w.data, 1)
	}); a != 0 {
		t.Errorf("a toy allocates %v times, want 0", a)
	}
}
