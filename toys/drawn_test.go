package toys

import (
	"context"
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"

	"lumireach/stats"
)

// drawnAtLeast is P(N >= n) of a Poisson count whose mean is drawn, by quadrature
// over what it is drawn from: mean(θ) for a normal θ.
func drawnAtLeast(n int, mean func(theta float64) float64) float64 {
	sum := 0.0
	// Pieces of one standard deviation each, to 1e-12.
	for k := -12.0; k < 12; k++ {
		sum += quad.Fixed(func(x float64) float64 {
			return math.Exp(-x*x/2) / math.Sqrt(2*math.Pi) * stats.PoissonAtLeast(n, mean(x))
		}, k, k+1, 20, quad.Legendre{}, 0)
	}
	return sum
}

// firstPassing is the smallest count of a one-bin search whose q0 is at least q.
func firstPassing(e *stats.Engine, q float64) int {
	f := e.Fitter()
	d := e.Point(0, nil).Asimov()
	for n := 0; ; n++ {
		d.N[0] = float64(n)
		if got, _ := f.Q0(d, 0); got >= q-tie {
			return n
		}
	}
}

// Tails of q0 with drawn parameters against quadrature over the parameter and
// Poisson sums: q0 of a count whose auxiliary values stay is a function of the
// count alone. With a simulation factor the mean is a Gamma variable, by the
// negative binomial sum (Johnson, Kemp & Kotz, Univariate Discrete
// Distributions, section 5.3).
func TestDrawnTail(t *testing.T) {
	const (
		k    = 4 // quoted errors; right code fails for 1 seed in 16000 per check
		toys = 20000
	)
	lognormal := func(b, size float64) func(float64) float64 {
		return func(theta float64) float64 { return b * math.Pow(1+size, theta) }
	}
	gamma := func(b, tau float64) func(float64) float64 {
		g := distuv.Gamma{Alpha: tau + 1, Beta: tau}
		return func(theta float64) float64 { return b * g.Quantile(distuv.UnitNormal.CDF(theta)) }
	}
	for _, c := range []struct {
		name   string
		search stats.Search
		mean   func(float64) float64
	}{
		{"b = 120 ± 20 %", uncertain(10, 120, 0.2), lognormal(120, 0.2)},
		{"b = 120 ± 40 %", uncertain(10, 120, 0.4), lognormal(120, 0.4)},
		{"b = 3 ± 30 %", uncertain(10, 3, 0.3), lognormal(3, 0.3)},
		{"b = 20 by 40 simulated events", simulated(10, 20, 40), gamma(20, 40)},
	} {
		e := engine(t, c.search, 1)
		r := testRunner(t, Config{Toys: toys, Seed: 7, Nuisances: Drawn})
		null, err := r.null(e, 1, span{1, 5}, toys, nil)
		if err != nil {
			t.Fatal(err)
		}
		for _, q := range []float64{1, 9, 25} {
			want := drawnAtLeast(firstPassing(e, q), c.mean)
			got := null.p(q)
			t.Logf("%s: P(q0 >= %v) = %.4g ± %.1f %%, want %.4g, %+.1f errors off", c.name, q, got.p, 100*got.err/got.p, want, (got.p-want)/got.err)
			if !(math.Abs(got.p-want) <= k*got.err) || !(got.err < 0.06*got.p) {
				t.Errorf("%s: P(q0 >= %v) = %v ± %v, want %v (seed 7)", c.name, q, got.p, got.err, want)
			}
		}
	}
}

// Limits and chances with drawn parameters, by the same quadrature: a count's
// limit rises with the count, so its quantiles are those of the count.
func TestDrawnReach(t *testing.T) {
	const k = 4.5 // quoted errors; right code fails for 1 seed in 150000 per check
	const s, b, size = 12, 30, 0.25
	search := uncertain(s, b, size)
	r, err := Reach(context.Background(), search, Config{WithoutExact: true, Luminosities: []float64{1}, Toys: 4000, Seed: 3, Nuisances: Drawn})
	if err != nil {
		t.Fatal(err)
	}
	mean := func(mu float64) func(float64) float64 {
		return func(theta float64) float64 { return mu*s + b*math.Pow(1+size, theta) }
	}
	x := r.Points[0].Toys.Exclusion
	for i, u := range quantiles {
		n := 0
		for 1-drawnAtLeast(n+1, mean(0)) < u {
			n++
		}
		want, err := stats.Root(func(mu float64) float64 {
			return (1-drawnAtLeast(n+1, mean(mu)))/(1-drawnAtLeast(n+1, mean(0))) - 0.05
		}, 0.01, 20, 1e-9)
		if err != nil {
			t.Fatal(err)
		}
		got, se := x.MuUp.list()[i], x.MuUpError.list()[i]
		other := x.MuUpOther.list()[i]
		if !(math.Abs(got-want) <= k*se) && !(math.Abs(other-want) <= k*se) {
			t.Errorf("limit %d is %v ± %v (or %v), want %v (seed 3)", i, got, se, other, want)
		}
		t.Logf("limit %d: %.4f ± %.4f, want %.4f", i, got, se, want)
	}
	// The count that reaches 3σ by its own p-value.
	n := firstPassing(engine(t, search, 1), 0.1)
	for drawnAtLeast(n, mean(0)) > stats.PValue(3) {
		n++
	}
	want := drawnAtLeast(n, mean(1))
	d := r.Points[0].Toys.Discovery
	t.Logf("chance of 3σ: %.4f ± %.4f, want %.4f", d.Chance3, d.Chance3Error, want)
	if !(math.Abs(d.Chance3-want) <= k*d.Chance3Error) {
		t.Errorf("chance of 3σ is %v ± %v, want %v (seed 3)", d.Chance3, d.Chance3Error, want)
	}
}

// Weighted toys of a window with free backgrounds and a floating peak against
// plain ones, all of them drawn.
func TestDrawnWindow(t *testing.T) {
	const k = 4.5 // errors; right code fails for 1 seed in 150000 per check
	r := testRunner(t, Config{Seed: 11, Nuisances: Drawn})
	e := engine(t, scenario(t, "window"), 1)
	null, err := r.null(e, 1, span{1, 5}, 10000, nil)
	if err != nil {
		t.Fatal(err)
	}
	plain, err := r.throw(e, 1, pilotLimitToys, []proposal{r.at(e, 0, 30000)})
	if err != nil {
		t.Fatal(err)
	}
	all := newTail(plain)
	for _, q := range []float64{1, 4, 9} {
		got, want := null.p(q), all.p(q)
		t.Logf("P(q0 >= %v) = %.4g ± %.2g, plain %.4g ± %.2g", q, got.p, got.err, want.p, want.err)
		if !(math.Abs(got.p-want.p) <= k*math.Hypot(got.err, want.err)) {
			t.Errorf("P(q0 >= %v) = %v ± %v, plain toys have %v ± %v (seed 11)", q, got.p, got.err, want.p, want.err)
		}
	}
	if e := null.p(25); !null.trusts(e) || !(e.err < 0.1*e.p) {
		t.Errorf("P(q0 >= 25) = %v ± %v, want it trusted and known to 10 %%", e.p, e.err)
	}
}

// cliff exists below a place of its quantity alone.
type cliff struct{ end float64 }

func (s cliff) Fill(q, f, d1, d2 []float64) {
	for i := range f {
		f[i] = 0.5
		if q[0] > s.end {
			f[i] = math.NaN()
		}
	}
	for i := range d1 {
		d1[i] = 0
	}
	for i := range d2 {
		d2[i] = 0
	}
}

// Parameters drawn where a shape does not exist give no data: the toy counts as
// failed, no more often than its parameters are drawn, and the run ends.
func TestDrawnBeyondShape(t *testing.T) {
	const (
		k    = 4.5 // errors; right code fails for 1 seed in 150000
		toys = 4000
	)
	search := func(l float64) (stats.Model, error) {
		m, err := uncertain(10, 20, 0.1)(l)
		m.Params = append(m.Params, m.Params[0])
		m.Channels = append(m.Channels, stats.Channel{Bins: 2, Processes: []stats.Process{
			{Yield: 5 * l, Factor: -1, Shape: cliff{1}, At: []float64{0}, Move: [][]stats.Effect{{{Param: 1, Lin: 1}}}},
		}})
		return m, err
	}
	r := testRunner(t, Config{Toys: toys, Seed: 13, Nuisances: Drawn})
	e := engine(t, search, 1)
	signal, err := r.signal(e, 1, toys)
	if err != nil {
		t.Fatal(err)
	}
	want := stats.PValue(1)
	if got, se := float64(signal.failed)/toys, math.Sqrt(want*(1-want)/toys); math.Abs(got-want) > k*se {
		t.Errorf("%v of the toys failed, want %v ± %v (seed 13)", got, want, se)
	}
	x, err := r.limits(e, 1, formulaExclusion(e, 0.95).MuUp)
	if err != nil {
		t.Fatal(err)
	}
	if x.FailedFits == 0 {
		t.Error("no failed fit among the toys of limits")
	}
}
