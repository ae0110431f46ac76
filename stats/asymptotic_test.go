package stats

import (
	"errors"
	"math"
	"testing"

	"gonum.org/v1/gonum/optimize"
)

func near(t *testing.T, what string, got, want, relative float64) {
	t.Helper()
	if !(math.Abs(got-want) <= relative*math.Abs(want)) {
		t.Errorf("%s = %v, want %v to %v", what, got, want, relative)
	}
}

// knownB is the median significance of a count with b known: Cowan, Cranmer,
// Gross, Vitells, Eur. Phys. J. C71 (2011) 1554, Eq. (97).
func knownB(s, b float64) float64 {
	return math.Sqrt(2 * ((s+b)*math.Log1p(s/b) - s))
}

// liMa is the significance of n events on source and m off source with tau
// times the exposure: Li & Ma, Astrophys. J. 272 (1983) 317, Eq. (17), with
// their α = 1/tau.
func liMa(n, m, tau float64) float64 {
	alpha := 1 / tau
	return math.Sqrt2 * math.Sqrt(n*math.Log((1+alpha)/alpha*n/(n+m))+m*math.Log((1+alpha)*m/(n+m)))
}

func TestMedianZOfCount(t *testing.T) {
	for _, c := range [][2]float64{{2, 0.1}, {5, 0.5}, {5, 1}, {5, 5}, {10, 10}, {10, 100}, {20, 9}, {25, 25}, {100, 400}, {1e-3, 1e4}, {3e4, 1e7}} {
		z, err := prepare(t, count(c[0], c[1])).MedianZ(1)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "MedianZ", z, knownB(c[0], c[1]), 1e-9)
	}
}

func TestMedianZOfOnOff(t *testing.T) {
	for _, c := range [][3]float64{{10, 20, 2}, {5, 0.5, 50}, {5, 5, 5}, {50, 100, 2}, {0.3, 2, 0.1}, {1000, 1e6, 1}} {
		z, err := prepare(t, onOff(c[0], c[1], c[2])).MedianZ(1)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "MedianZ", z, liMa(c[0]+c[1], c[2]*c[1], c[2]), 1e-8)
	}
}

// The five quantiles of the expected CLs limit of a Gaussian measurement of
// width σ = √b, in units of σ: Φ⁻¹(1 - 0.05 Φ(N)) + N, CCGV Eq. (89) with CLs.
func TestExpectedLimitGaussian(t *testing.T) {
	const b = 1e12
	e := prepare(t, count(1e6, b)) // μ = 1 is one σ
	for n, want := range map[float64]float64{-2: 1.052, -1: 1.412, 0: 1.960, 1: 2.727, 2: 3.656} {
		got, err := e.ExpectedLimit(n, 0.95)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(got-want) > 0.0006 {
			t.Errorf("limit at %+v sigma = %v, want %v", n, got, want)
		}
		near(t, "limit", got, n+Significance(0.05*Phi(n)), 1e-5)
	}
}

// A count's limit by the formula solves an equation in closed form: q̃ of the
// Asimov data is 2(s - b ln(1+s/b)).
func TestExpectedLimitOfCount(t *testing.T) {
	for _, b := range []float64{0, 0.18, 5, 100} {
		e := prepare(t, count(1, b))
		for _, n := range []float64{-2, -1, 0, 1, 2} {
			s, err := e.ExpectedLimit(n, 0.95)
			if err != nil {
				t.Fatal(err)
			}
			q := 2 * s
			if b > 0 {
				q -= 2 * b * math.Log1p(s/b)
			}
			near(t, "sqrt(q) at the limit", math.Sqrt(q), n+Significance(0.05*Phi(n)), 1e-7)
		}
	}
}

// A mass window with free background and three uncertainties, against a
// general-purpose minimiser on the bare likelihood.
func TestWindowAgainstMinimiser(t *testing.T) {
	m := window(50, 2000, 0.3)
	nominal := []float64{1, 0, 0, 0, 0}
	e := prepare(t, m)

	z, err := e.MedianZ(1)
	if err != nil {
		t.Fatal(err)
	}
	asimov := expectation(m, 1, nominal)
	q, _ := reference(m, 0, false, asimov, make([]float64, 3))
	near(t, "MedianZ", z, math.Sqrt(2*q), 1e-6)

	limit, err := e.ExpectedLimit(0, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	q, _ = reference(m, limit, false, expectation(m, 0, nominal), make([]float64, 3))
	near(t, "sqrt(q) at the limit", math.Sqrt(2*q), Significance(0.025), 1e-6)
}

func TestNoBackground(t *testing.T) {
	e := prepare(t, count(2, 0))
	if _, err := e.MedianZ(1); !errors.Is(err, ErrOneEvent) {
		t.Errorf("MedianZ without background: %v, want %v", err, ErrOneEvent)
	}
	near(t, "signal where no background falls", e.Bare(), 2, 1e-12)
}

// Luminosity for 5σ of a count with s = 0.9, b = 0.5 per unit, b known: 23.09;
// with a control region of three times the background 34.3 (solved here from
// the closed forms).
func TestLuminosityForGoal(t *testing.T) {
	five := func(e *Engine) (float64, error) {
		z, err := e.MedianZ(1)
		return z - 5, err
	}
	known := Search(func(l float64) (Model, error) { return count(0.9*l, 0.5*l), nil })
	l, err := known.Luminosity(five, 0.01, 1e4)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "5σ luminosity", l, 25/(knownB(0.9, 0.5)*knownB(0.9, 0.5)), 1e-8)
	if math.Abs(l-23.09) > 0.005 {
		t.Errorf("5σ luminosity = %v, want 23.09", l)
	}
	control := Search(func(l float64) (Model, error) { return onOff(0.9*l, 0.5*l, 3), nil })
	if l, err = control.Luminosity(five, 0.01, 1e4); err != nil {
		t.Fatal(err)
	}
	near(t, "5σ luminosity", l, 25/math.Pow(liMa(1.4, 1.5, 3), 2), 1e-8)
	if math.Abs(l-34.3) > 0.05 {
		t.Errorf("5σ luminosity = %v, want 34.3", l)
	}
}

// uncertain is a count whose background is known to a relative size.
func uncertain(s, b, size float64) Search {
	return func(l float64) (Model, error) {
		m := count(s*l, b*l)
		m.Params = []Param{uncertainty("background")}
		m.Channels[0].Processes[1].Rate = []Effect{{Param: 0, Lin: math.Log1p(size)}}
		return m, nil
	}
}

// At infinite luminosity a background known to a log-normal factor 1+δ explains
// a signal by a pull of ln(1+s/b)/ln(1+δ), which is the plateau of Z; and it
// hides a signal of b(1 - (1+δ)^-z)/s, the plateau of the limit.
func TestPlateau(t *testing.T) {
	search := uncertain(1, 10, 0.05)
	z, err := search.Plateau(func(e *Engine) (float64, error) { return e.MedianZ(1) }, 100)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "plateau of Z", z, math.Log(1.1)/math.Log(1.05), 2e-6)
	mu, err := search.Plateau(func(e *Engine) (float64, error) { return e.ExpectedLimit(0, 0.95) }, 100)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "plateau of the limit", mu, 10*(1-math.Pow(1.05, -Significance(0.025))), 2e-6)

	if _, err := search.Luminosity(func(e *Engine) (float64, error) {
		z, err := e.MedianZ(1)
		return z - 5, err
	}, 0.01, 1e5); !errors.Is(err, ErrNotReached) {
		t.Errorf("5σ behind a plateau of 2σ: %v, want %v", err, ErrNotReached)
	}

	growing := Search(func(l float64) (Model, error) { return onOff(l, 10*l, 1), nil })
	if z, err := growing.Plateau(func(e *Engine) (float64, error) { return e.MedianZ(1) }, 100); err != nil || !math.IsNaN(z) {
		t.Errorf("plateau where Z grows without bound = %v, %v, want none", z, err)
	}
}

// Sanity of the reference itself: gonum finds a parabola's minimum.
func TestReferenceMinimiser(t *testing.T) {
	result, err := optimize.Minimize(optimize.Problem{Func: func(x []float64) float64 { return (x[0] - 3) * (x[0] - 3) }}, []float64{0}, nil, &optimize.NelderMead{})
	if err != nil || math.Abs(result.X[0]-3) > 1e-3 {
		t.Errorf("minimum at %v, %v", result, err)
	}
}
