package stats

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
	"pgregory.net/rapid"
)

func TestNormalTails(t *testing.T) {
	for _, p := range rowsOf(t, "N-tail") {
		p.agrees(t, 0, PValue(p.input["Z"]))
	}
	for _, p := range rowsOf(t, "N-lnQ") {
		p.agrees(t, 0, math.Log(PValue(p.input["x"])))
	}
	for _, p := range rowsOf(t, "N-AS") {
		if x := p.input["x"]; x <= 37 {
			p.printed = nil // one row truncates, 11.8928 for 11.89285
			p.agrees(t, 0, -math.Log10(PValue(x)))
		}
	}
	for _, p := range rowsOf(t, "N-PDG-") {
		p.printed = nil // truncated there, not rounded, in two rows
		p.agrees(t, 0, 2*PValue(p.input["Z"]))
	}
	for _, p := range rowsOf(t, "N-PDGd") {
		p.agrees(t, 0, Significance(p.input["alpha"]/2))
	}
	for _, p := range rowsOf(t, "N-3s") {
		p.agrees(t, 0, Phi(p.input["Z"])-Phi(-p.input["Z"]))
	}
}

func TestSignificance(t *testing.T) {
	for _, c := range []struct{ p, want float64 }{{1, math.Inf(-1)}, {0, math.Inf(1)}, {0.5, 0}} {
		if got := Significance(c.p); got != c.want || math.Signbit(got) != math.Signbit(c.want) {
			t.Errorf("Significance(%v) = %v, want %v", c.p, got, c.want)
		}
	}
	for _, p := range []float64{-1e-9, 1.1, math.NaN()} {
		if got := Significance(p); !math.IsNaN(got) {
			t.Errorf("Significance(%v) = %v, want NaN", p, got)
		}
	}
	for z := -8.0; z <= 37; z += 0.37 {
		// Near p = 1 the digits are those of 1-p.
		tolerance := math.Max(1e-12*math.Abs(z), 4e-16/math.Max(1e-300, math.Exp(-z*z/2)))
		if z > 0 {
			tolerance = 1e-12 * z
		}
		if got := Significance(PValue(z)); math.Abs(got-z) > tolerance {
			t.Errorf("Significance(PValue(%v)) = %v", z, got)
		}
		if got := PhiInverse(Phi(-z)); math.Abs(got+z) > tolerance {
			t.Errorf("PhiInverse(Phi(%v)) = %v", -z, got)
		}
	}
}

func TestPoissonLimits(t *testing.T) {
	for _, p := range rowsOf(t, "PL-PDG-up") {
		p.agrees(t, 0, PoissonUpper(int(p.input["n"]), p.input["CL"]))
	}
	for _, p := range rowsOf(t, "PL-PDG-lo") {
		p.agrees(t, 0, PoissonLower(int(p.input["n"]), p.input["CL"]))
	}
	// The confidences of these tables are those of 1, 2 and 3 standard deviations.
	sigmas := map[float64]float64{0.8413: Phi(1), 0.9772: Phi(2), 0.9987: Phi(3)}
	confidence := func(p published) float64 {
		if c, ok := sigmas[p.input["CL"]]; ok {
			return c
		}
		return p.input["CL"]
	}
	for _, p := range rowsOf(t, "PL-G1") {
		p.agrees(t, 0, PoissonUpper(int(p.input["n"]), confidence(p)))
	}
	for _, p := range rowsOf(t, "PL-G2") {
		p.agrees(t, 0, PoissonLower(int(p.input["n"]), confidence(p)))
	}
	for _, p := range rowsOf(t, "PL-Rdoc") {
		lower, upper := PoissonInterval(int(p.input["x"]), 0.95)
		p.agrees(t, 0, lower/p.input["T"])
		p.agrees(t, 1, upper/p.input["T"])
	}
	for _, p := range rowsOf(t, "PL-ci0-2s") {
		_, upper := PoissonInterval(0, 0.95)
		p.agrees(t, 0, upper)
	}
	for _, p := range rowsOf(t, "PL-ci0-1s") {
		p.agrees(t, 0, PoissonUpper(0, 0.95))
	}
	for _, p := range rowsOf(t, "H-pois") {
		for n := range p.printed {
			// The source truncates some of its three digits.
			want := LogPoisson(n, p.input["m"])
			p := p
			p.printed = nil
			p.agrees(t, n, math.Exp(want))
		}
	}
}

// Tails against a plain sum of probabilities. The incomplete gamma ratio loses
// digits at large means: 5e-6 of itself at a million.
func TestPoissonTailSums(t *testing.T) {
	for _, c := range []struct {
		n  int
		mu float64
	}{{3, 0.01}, {20, 2}, {60, 5}, {150, 50}, {1200, 1000}, {1005000, 1e6}} {
		sum, term := 0.0, math.Exp(LogPoisson(c.n, c.mu))
		for k := c.n; term > 1e-18*sum; k++ {
			sum += term
			term *= c.mu / float64(k+1)
		}
		if got := PoissonAtLeast(c.n, c.mu); math.Abs(got-sum) > 1e-5*sum {
			t.Errorf("PoissonAtLeast(%v, %v) = %v, the sum is %v", c.n, c.mu, got, sum)
		}
		if got := PoissonAtMost(c.n-1, c.mu) + PoissonAtLeast(c.n, c.mu); math.Abs(got-1) > 1e-9 {
			t.Errorf("tails of %v about %v sum to %v", c.mu, c.n, got)
		}
	}
	if PoissonAtLeast(0, 0) != 1 || PoissonAtLeast(1, 0) != 0 || PoissonAtMost(0, 0) != 1 || PoissonAtMost(-1, 3) != 0 {
		t.Error("tails at mean 0 or below count 0 are wrong")
	}
}

// CLs of a count with known background solves Q(n+1, s+b)/Q(n+1, b) = α, which
// equals the flat-prior Bayesian limit: rows IDN-CLS and CLS-n0.
func TestCLsOfCount(t *testing.T) {
	for _, prefix := range []string{"IDN-CLS", "CLS-n0"} {
		for _, p := range rowsOf(t, prefix) {
			alpha := 0.05
			if cl, ok := p.input["CL"]; ok {
				alpha = 1 - cl
			}
			n, b := int(p.input["n"]), p.input["b"]
			s, err := Root(func(s float64) float64 {
				return PoissonAtMost(n, s+b)/PoissonAtMost(n, b) - alpha
			}, 1e-6, 1000, 1e-10)
			if err != nil {
				t.Fatal(err)
			}
			p.agrees(t, 0, s)
		}
	}
}

func TestBinomial(t *testing.T) {
	for _, p := range rowsOf(t, "CLT-") {
		if p.id[len(p.id)-4:] != "Z_Bi" {
			continue
		}
		// Z_Bi: the count on source given the total is binomial with 1/(1+τ).
		on, off, tau := p.input["n_on"], p.input["n_off"], p.input["tau"]
		if off != math.Floor(off) {
			continue // its inputs are rounded
		}
		p.agrees(t, 0, Significance(BinomialAtLeast(int(on), int(on+off), 1/(1+tau))))
	}
	for _, p := range rowsOf(t, "H-binom") {
		n := int(p.input["n"])
		for x := range p.printed {
			p.agrees(t, x, BinomialAtLeast(n-x, n, 1-p.input["p"]))
		}
	}
}

// The ends of a Clopper-Pearson interval are where the tail is half of what is
// left out, by direct sums; and its coverage is never below the promise.
func TestBinomialInterval(t *testing.T) {
	for _, c := range [][2]int{{0, 10}, {1, 10}, {5, 10}, {10, 10}, {3, 200000}, {0, 5000}} {
		k, n := c[0], c[1]
		lower, upper := BinomialInterval(k, n, 0.9)
		d := distuv.Binomial{N: float64(n), P: lower}
		sum := 0.0
		for x := k; x <= min(n, k+200); x++ {
			sum += d.Prob(float64(x))
		}
		if k > 0 && math.Abs(sum-0.05) > 1e-6 {
			t.Errorf("%d of %d: tail at the lower end %v is %v, want 0.05", k, n, lower, sum)
		}
		d.P, sum = upper, 0
		for x := 0; x <= k; x++ {
			sum += d.Prob(float64(x))
		}
		if k < n && math.Abs(sum-0.05) > 1e-6 {
			t.Errorf("%d of %d: tail at the upper end %v is %v, want 0.05", k, n, upper, sum)
		}
	}
	for p := 0.01; p < 1; p += 0.07 {
		covered := 0.0
		for k := 0; k <= 20; k++ {
			if lower, upper := BinomialInterval(k, 20, 0.9); lower <= p && p <= upper {
				covered += distuv.Binomial{N: 20, P: p}.Prob(float64(k))
			}
		}
		if covered < 0.9 {
			t.Errorf("coverage at %v is %v, want at least 0.9", p, covered)
		}
	}
}

// Coverage of order-statistic intervals by the exact binomial sum: the number of
// values below the quantile is binomial.
func TestQuantileInterval(t *testing.T) {
	for _, n := range []int{200, 1000, 5000} {
		for _, u := range []float64{Phi(-2), Phi(-1), 0.5, Phi(1), Phi(2)} {
			lower, upper := QuantileInterval(n, u, 0.6827)
			d := distuv.Binomial{N: float64(n), P: u}
			covered := 0.0
			for below := lower + 1; below <= upper; below++ {
				covered += d.Prob(float64(below))
			}
			if covered < 0.6827-1e-9 || covered > 0.6827+3/math.Sqrt(2*math.Pi*float64(n)*u*(1-u)) {
				t.Errorf("n = %d, u = %v: places %d to %d cover %v, want 0.6827 and little more", n, u, lower, upper, covered)
			}
		}
	}
	for _, c := range []struct {
		n    int
		u    float64
		want int
	}{{10, 0.5, 4}, {11, 0.5, 5}, {10, 0.1, 0}, {10, 1, 9}, {10, 0, 0}, {1000, 0.7, 699}} {
		if got := QuantileIndex(c.n, c.u); got != c.want {
			t.Errorf("QuantileIndex(%d, %v) = %d, want %d", c.n, c.u, got, c.want)
		}
	}
}

func TestRoot(t *testing.T) {
	for _, c := range []struct {
		name string
		f    func(float64) float64
		a, b float64
		want float64
	}{
		{"cosine", math.Cos, 1, 2, math.Pi / 2},
		{"cube", func(x float64) float64 { return x*x*x - 2 }, 0, 100, math.Cbrt(2)},
		{"flat", func(x float64) float64 { return math.Pow(x-1, 9) }, 0, 3, 1},
		{"steep", func(x float64) float64 { return math.Tanh(1e6 * (x - 0.3)) }, 0, 1, 0.3},
		{"at an end", func(x float64) float64 { return x }, 0, 1, 0},
	} {
		got, err := Root(c.f, c.a, c.b, 1e-12)
		if err != nil || math.Abs(got-c.want) > 1e-11 && c.f(got) != 0 {
			t.Errorf("%s: root %v, %v, want %v", c.name, got, err, c.want)
		}
	}
	if _, err := Root(math.Cos, 0, 1, 1e-9); err == nil {
		t.Error("no error where nothing changes sign")
	}
	if _, err := Root(func(x float64) float64 {
		if x == 0 || x == 1 {
			return x - 0.5
		}
		return math.NaN()
	}, 0, 1, 1e-9); err == nil {
		t.Error("no error where the function has no value")
	}
}

func TestTailProperties(t *testing.T) {
	rapid.Check(t, func(r *rapid.T) {
		mu := rapid.Float64Range(0, 1e5).Draw(r, "mu")
		n := rapid.IntRange(0, 200000).Draw(r, "n")
		p, next := PoissonAtLeast(n, mu), PoissonAtLeast(n+1, mu)
		if !(p >= 0 && p <= 1 && next <= p) {
			r.Fatalf("P(N >= %d) = %v, P(N >= %d) = %v at mean %v", n, p, n+1, next, mu)
		}
		a, b := rapid.Float64Range(-40, 40).Draw(r, "a"), rapid.Float64Range(-40, 40).Draw(r, "b")
		if a < b && PValue(a) < PValue(b) || PValue(a) < 0 || PValue(a) > 1 {
			r.Fatalf("PValue(%v) = %v, PValue(%v) = %v", a, PValue(a), b, PValue(b))
		}
	})
}
