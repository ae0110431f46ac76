package toys

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/stat"

	"lumireach/stats"
)

// Exact tails against rows DER-exact-onoff and DER-exact-known of
// testdata/reference/published.csv (recomputed, from memory), and against sums made
// apart for a log-normal background.
func TestExactTails(t *testing.T) {
	for _, c := range []struct {
		name   string
		search stats.Search
		q      float64
		want   float64
	}{
		{"b = 20, τ = 2", onOff(10, 20, 2), 25, 3.03198e-7},
		{"b = 2, τ = 1", onOff(10, 2, 1), 9, 0.000615889},
		{"b = 2, τ = 1", onOff(10, 2, 1), 16, 1.846958e-07},
		{"b = 2, τ = 1", onOff(10, 2, 1), 25, 8.766176e-14},
		{"b = 5, τ = 1", onOff(10, 5, 1), 9, 0.00224452},
		{"b = 5, τ = 1", onOff(10, 5, 1), 25, 9.472238e-09},
		{"b = 100, τ = 1", onOff(10, 100, 1), 16, 3.252274e-05},
		{"b = 100, τ = 1", onOff(10, 100, 1), 25, 2.985473e-07},
		{"b = 120 ± 20 %", uncertain(10, 120, 0.2), 25, 2.633376e-7},
		{"b = 120 ± 40 %", uncertain(10, 120, 0.4), 25, 2.709506e-7},
		{"b = 0.5 ± 30 %", uncertain(10, 0.5, 0.3), 25, 1.818598e-7},
		{"b = 0.5", count(1, 0.5), 9, 0.00175162},
		{"b = 0.5", count(1, 0.5), 25, 6.219691e-08},
		{"b = 1000", count(1, 1000), 25, 2.674934e-07},
	} {
		table, err := exactTable(engine(t, c.search, 1), 1, 6)
		if err != nil {
			t.Fatal(err)
		}
		if got := table.atLeast(math.Sqrt(c.q), 0, true); math.Abs(got-c.want) > 2e-6*c.want {
			t.Errorf("%s: P(q0 >= %v) = %v, want %v", c.name, c.q, got, c.want)
		}
	}
}

// Exact limits and significances against sums that order the outcomes by
// themselves, and limits of counts against their closed form: CLs of a count is a
// ratio of two Poisson sums (Read, J. Phys. G 28 (2002) 2693).
func TestExactReach(t *testing.T) {
	for _, b := range []float64{0.18, 0.72, 5, 100} {
		e := engine(t, count(1, b), 1)
		x := exactExclusion(e, 0.95, formulaExclusion(e, 0.95).MuUp)
		for i, got := range x.MuUp.list() {
			n := 0
			for stats.PoissonAtMost(n, b) < quantiles[i] {
				n++
			}
			want, err := stats.Root(func(s float64) float64 {
				return stats.PoissonAtMost(n, s+b)/stats.PoissonAtMost(n, b) - 0.05
			}, 0, 100, 1e-10)
			if err != nil {
				t.Fatal(err)
			}
			if math.Abs(got-want) > 1e-6*want {
				t.Errorf("b = %v: limit %d is %v, want %v", b, i, got, want)
			}
		}
	}
	e := engine(t, onOff(25, 150, 2), 1)
	formula, err := formulas(e, testRunner(t, Config{}).config)
	if err != nil {
		t.Fatal(err)
	}
	a := exactly(e, testRunner(t, Config{}).config, formula)
	for i, want := range exactCount[1:7] {
		got := append([]float64{a.Discovery.Z.Median}, listOf(a.Exclusion.MuUp)...)[i]
		if math.Abs(got-want) > 3e-5*want {
			t.Errorf("on/off: %s is %v, want %v", answerNames[1+i], got, want)
		}
	}
	coverage := 1.0
	enumerate(e, 1, qTildeOf(1)).walkCLs(func(null, cls float64) bool {
		if cls <= 0.05 {
			coverage = 1 - cls*null
		}
		return true
	})
	if math.Abs(a.Coverage-coverage) > 1e-6 {
		t.Errorf("coverage is %v, want %v", a.Coverage, coverage)
	}
}

func listOf(b Band) []float64 {
	l := b.list()
	return l[:]
}

// Goals of counts rise and fall in steps: the first luminosity that reaches one
// and that after which it never fails again, against a walk over the counts in
// small steps of the luminosity.
func TestExactGoals(t *testing.T) {
	const s, b = 0.9, 0.5
	r := testRunner(t, Config{Luminosities: []float64{20}})
	result, err := reach(r, count(s, b))
	if err != nil {
		t.Fatal(err)
	}
	chance := map[string]func(l float64) float64{
		"evidence":  func(l float64) float64 { return discoveryChance(s, b, 3, l) },
		"discovery": func(l float64) float64 { return discoveryChance(s, b, 5, l) },
		"exclusion": func(l float64) float64 {
			excluded := 0.0
			for n := 0; stats.PoissonAtMost(n, (s+b)*l) <= 0.05*stats.PoissonAtMost(n, b*l); n++ {
				excluded = stats.PoissonAtMost(n, b*l)
			}
			return excluded
		},
	}
	for _, g := range result.Goals {
		for k, fraction := range fractions {
			first, always := math.NaN(), math.NaN()
			const step = 2e-4
			for l := 1.; l < 60; l *= 1 + step {
				switch ok := chance[g.Name](l) >= fraction; {
				case !ok:
					always = math.NaN()
				case math.IsNaN(always):
					always = l
					if math.IsNaN(first) {
						first = l
					}
				}
			}
			if got := g.Exact.First[k]; math.Abs(got-first) > 2*step*first {
				t.Errorf("%s by %v: first at %v, want %v", g.Name, fraction, got, first)
			}
			if got := g.Exact.AlwaysAfter[k]; math.Abs(got-always) > 2*step*always {
				t.Errorf("%s by %v: always after %v, want %v", g.Name, fraction, got, always)
			}
		}
	}
	// Published as an effect by Bhattiprolu, Martin & Wells, arXiv:2009.07249;
	// these numbers are computed apart from this program.
	d := result.Goals[1].Exact
	for k, want := range [3][2]float64{{23.33, 24.76}, {33.05, 34.57}, {39.20, 40.76}} {
		if math.Abs(d.First[k]-want[0]) > 0.006 || math.Abs(d.AlwaysAfter[k]-want[1]) > 0.006 {
			t.Errorf("5σ by %v: %v and %v, want %v", fractions[k], d.First[k], d.AlwaysAfter[k], want)
		}
	}
}

func discoveryChance(s, b, z, l float64) float64 {
	n := 0
	for stats.PoissonAtLeast(n, b*l) > stats.PValue(z) {
		n++
	}
	return stats.PoissonAtLeast(n, (s+b)*l)
}

// Exact and toys on random counts: the toys' errors are those of their distance
// from the exact numbers.
func TestExactAgainstToys(t *testing.T) {
	r := rand.New(rand.NewPCG(31, 32))
	var pulls []float64
	scenarios := 20
	if testing.Short() {
		scenarios = 6
	}
	for k := range scenarios {
		b := math.Pow(10, 2.5*r.Float64())
		s := (1 + 3*r.Float64()) * math.Sqrt(b+1)
		search := []stats.Search{count(s, b), onOff(s, b, 0.5+3*r.Float64()), uncertain(s, b, 0.05+0.3*r.Float64())}[k%3]
		run := testRunner(t, Config{Toys: 2000, Seed: uint64(k + 1)})
		e := engine(t, search, 1)
		formula, err := formulas(e, run.config)
		if err != nil {
			t.Fatal(err)
		}
		d, err := run.discover(e, 1, formula.Discovery.Z)
		if err != nil {
			t.Fatal(err)
		}
		x, err := run.limits(e, 1, formula.Exclusion.MuUp)
		if err != nil {
			t.Fatal(err)
		}
		exact := exactly(e, run.config, formula)
		name := fmt.Sprintf("scenario %d (s = %.3g, b = %.3g)", k, s, b)
		add := func(what string, got, se, other, want float64) {
			if math.IsNaN(got) || !(se > 0) { // refused, or cut at 0
				return
			}
			pull := (got - want) / se
			if !math.IsNaN(other) && math.Abs(other-want) < math.Abs(got-want) {
				pull = (other - want) / se
			}
			pulls = append(pulls, pull)
			if math.Abs(pull) > 5 {
				t.Errorf("%s: %s is %v ± %v, exactly %v", name, what, got, se, want)
			}
		}
		z, zError, zWant := d.Z.list(), d.ZError.list(), exact.Discovery.Z.list()
		mu, muError, muWant, other := x.MuUp.list(), x.MuUpError.list(), exact.Exclusion.MuUp.list(), x.MuUpOther.list()
		for i := range z {
			if z[i] > 0 {
				add(fmt.Sprintf("Z at quantile %d", i), z[i], zError[i], math.NaN(), zWant[i])
			}
			add(fmt.Sprintf("limit at quantile %d", i), mu[i], muError[i], other[i], muWant[i])
		}
	}
	mean, width := stat.MeanStdDev(pulls, nil)
	t.Logf("%d pulls: mean %.2f, width %.2f", len(pulls), mean, width)
	if !(math.Abs(mean) < 0.3) || !(math.Abs(width-1) < 0.35) {
		t.Errorf("pulls have mean %.2f and width %.2f, want 0 ± 0.3 and 1 ± 0.35", mean, width)
	}
}
