package physics

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/combin"
	"gonum.org/v1/gonum/stat/distuv"
	"lumireach/stats"
	"pgregory.net/rapid"
)

func bernsteinNominal(b binning, coefficients ...float64) []float64 {
	s := newBernstein(b, coefficients)
	f := make([]float64, b.bins)
	s.Fill(s.nominal, f, nil, nil)
	return f
}

func TestBernsteinFractions(t *testing.T) {
	for _, b := range []binning{equalBins(100, 160, 60), growing(-5, 0.01, 1.3, 30), equalBins(0, 1, 1000), equalBins(1, 2, 1)} {
		for _, c := range [][]float64{
			{7},
			{0, 1},
			{1, 0, 0},
			{3, 1, 0, 2},
			{0, 0, 1, 0, 0},
			{1, 1e-12, 1e-200, 1, 0, 0},
			{1e308, 1e308, 0.5e308, 1e308, 1e308, 1e308, 1e308, 0, 1e308},
			{1, 0, 0, 0, 0, 0, 0, 0, 0},
			{0, 0, 0, 0, 0, 0, 0, 0, 1},
			{5e-324, 0, 5e-324},
		} {
			t.Run(fmt.Sprintf("%v in %v bins", c, b.bins), func(t *testing.T) {
				largest := slices.Max(c)
				degree := len(c) - 1
				density := func(x float64) float64 {
					y, rest := (x-b.low)/b.window(), (b.high-x)/b.window()
					sum := 0.0
					for k, v := range c {
						sum += v / largest * float64(combin.Binomial(degree, k)) * math.Pow(y, float64(k)) * math.Pow(rest, float64(degree-k))
					}
					return math.Log(sum)
				}
				want := fractionsByQuadrature(b, density, 0, b.window(), b.low, b.high)
				compareFractions(t, bernsteinNominal(b, c...), want)
			})
		}
	}
}

// TestBernsteinBeta: a Bernstein polynomial normalised to one is a beta density,
// whose integral is the regularised incomplete beta function (DLMF 8.17; gonum,
// mathext). It is taken from the nearer end, where it does not cancel.
func TestBernsteinBeta(t *testing.T) {
	b := growing(3, 0.1, 1.2, 20)
	for n := 1; n <= mostCoefficients; n++ {
		basis := bernsteinFractions(b, n)
		for k := range n {
			for i, v := range basis[k] {
				low, high := (b.edge(i)-b.low)/b.window(), (b.edge(i+1)-b.low)/b.window()
				p, q := float64(k+1), float64(n-k)
				want := mathext.RegIncBeta(p, q, high) - mathext.RegIncBeta(p, q, low)
				if low > 0.5 {
					want = mathext.RegIncBeta(q, p, 1-low) - mathext.RegIncBeta(q, p, 1-high)
				}
				if !(math.Abs(v-want) < 1e-12*want+1e-15) {
					t.Errorf("polynomial %v of %v, bin %v: fraction %v, want %v", k, n, i, v, want)
				}
			}
		}
	}
}

// TestBernsteinClosedForms: polynomials that everybody knows.
func TestBernsteinClosedForms(t *testing.T) {
	for _, b := range []binning{equalBins(-3, 9, 12), growing(0, 1, 1.4, 9)} {
		for n := 1; n <= mostCoefficients; n++ {
			for i, v := range bernsteinNominal(b, slices.Repeat([]float64{0.3}, n)...) {
				want := (b.edge(i+1) - b.edge(i)) / b.window()
				if !(math.Abs(v-want) < 1e-14) {
					t.Errorf("%v equal coefficients, bin %v: fraction %v, want %v of uniform", n, i, v, want)
				}
			}
		}
		// From height 4 to height 1: the area of a trapezoid.
		for i, v := range bernsteinNominal(b, 4, 1) {
			low, high := (b.edge(i)-b.low)/b.window(), (b.edge(i+1)-b.low)/b.window()
			want := (high - low) * (8 - 3*low - 3*high) / 2 / 2.5
			if !(math.Abs(v-want) < 1e-14) {
				t.Errorf("trapezoid, bin %v: fraction %v, want %v", i, v, want)
			}
		}
		// x³ of the window.
		for i, v := range bernsteinNominal(b, 0, 0, 0, 2) {
			low, high := (b.edge(i)-b.low)/b.window(), (b.edge(i+1)-b.low)/b.window()
			want := math.Pow(high, 4) - math.Pow(low, 4)
			if !(math.Abs(v-want) < 1e-14) {
				t.Errorf("cube, bin %v: fraction %v, want %v", i, v, want)
			}
		}
	}
}

func drawCoefficients(t *rapid.T) []float64 {
	c := rapid.SliceOfN(rapid.OneOf(rapid.Just(0.), rapid.Float64Range(0, 1)), 1, mostCoefficients).Draw(t, "coefficients")
	c[rapid.IntRange(0, len(c)-1).Draw(t, "above zero")] = rapid.Float64Range(0.1, 1).Draw(t, "coefficient")
	return c
}

func TestBernsteinDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		if rapid.Bool().Draw(t, "unequal") {
			b = growing(b.low, b.binWidth(), rapid.Float64Range(0.9, 1.1).Draw(t, "ratio"), b.bins)
		}
		s := newBernstein(b, drawCoefficients(t))
		q, unit := make([]float64, len(s.nominal)), make([]float64, len(s.nominal))
		for a := range q {
			// Differences reach 2e-3 to either side, the shape from 0 to 1.
			q[a], unit[a] = rapid.Float64Range(0.0025, 0.9975).Draw(t, "share"), 1
		}
		checkDerivatives(t, s, b.bins, q, unit)
	})
}

// TestBernsteinEnds holds derivatives at the bounds, zeros and ones among the
// shares: along each share the shape is a straight line.
func TestBernsteinEnds(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		s := newBernstein(b, drawCoefficients(t))
		n := len(s.nominal)
		q := make([]float64, n)
		for a := range q {
			q[a] = rapid.OneOf(rapid.Just(0.), rapid.Just(1.), rapid.Float64Range(0, 1)).Draw(t, "share")
		}
		sized := func() (f, d1, d2 []float64) {
			return make([]float64, b.bins), make([]float64, n*b.bins), make([]float64, n*(n+1)/2*b.bins)
		}
		f, d1, d2 := sized()
		for i := range d2 {
			d2[i] = 7 // of an earlier call
		}
		s.Fill(q, f, d1, d2)
		row := 0
		for a := range n {
			ends := slices.Clone(q)
			ends[a] = 0
			f0, g0, h0 := sized()
			s.Fill(ends, f0, g0, h0)
			ends[a] = 1
			f1, g1, h1 := sized()
			s.Fill(ends, f1, g1, h1)
			for i := range f {
				if got, want := d1[a*b.bins+i], f1[i]-f0[i]; !(math.Abs(got-want) < 1e-14) {
					t.Fatalf("share %v, bin %v: derivative %v, difference of the ends %v", a, i, got, want)
				}
			}
			for c := a; c < n; c++ {
				for i := range f {
					got, want := d2[row*b.bins+i], g1[c*b.bins+i]-g0[c*b.bins+i]
					if !(math.Abs(got-want) < 1e-14) {
						t.Fatalf("shares %v and %v, bin %v: second derivative %v, difference of the ends %v", a, c, i, got, want)
					}
				}
				row++
			}
		}
	})
}

// TestBernsteinReachesEverything: shares from 0 to 1 give every set of
// coefficients whatever the nominal one was, and the nominal one is inside.
func TestBernsteinReachesEverything(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := equalBins(0, 1, 20)
		nominal, wanted := drawCoefficients(t), drawCoefficients(t)
		for len(wanted) < len(nominal) {
			wanted = append(wanted, 0)
		}
		wanted = wanted[:len(nominal)]
		if slices.Max(wanted) == 0 {
			wanted[0] = 1
		}
		s := newBernstein(b, nominal)
		// The coefficient that no quantity names takes the rest.
		largest := slices.Index(nominal, slices.Max(nominal))
		if slices.Contains(s.numbers, largest+1) && nominal[s.restOf()-1] != nominal[largest] {
			t.Fatalf("the rest goes to coefficient %v of %v, want the largest", s.restOf(), nominal)
		}
		for a, u := range s.nominal {
			if !(u >= 0 && u <= 0.5) || (u == 0) != (nominal[s.numbers[a]-1] == 0) {
				t.Fatalf("nominal share %v of %v is %v, want 0 to 0.5 and 0 only for none", a, nominal, u)
			}
		}
		// Shares of what is left, by the order in which nominal coefficients rise.
		q := make([]float64, len(s.nominal))
		for i, a := range s.shares {
			rest := 0.0
			for _, later := range s.shares[i:] {
				rest += wanted[s.numbers[later]-1]
			}
			rest += wanted[s.restOf()-1]
			if rest > 0 {
				q[a] = wanted[s.numbers[a]-1] / rest
			}
		}
		f := make([]float64, b.bins)
		s.Fill(q, f, nil, nil)
		for i, v := range bernsteinNominal(b, wanted...) {
			if !(math.Abs(f[i]-v) < 1e-13) {
				t.Fatalf("from %v to %v, bin %v: fraction %v, want %v", nominal, wanted, i, f[i], v)
			}
		}
	})
}

// restOf is the coefficient, from 1, that has no quantity.
func (s bernstein) restOf() int {
	for k := 1; ; k++ {
		if !slices.Contains(s.numbers, k) {
			return k
		}
	}
}

func TestBernsteinUndefined(t *testing.T) {
	b := equalBins(100, 160, 6)
	s := newBernstein(b, []float64{1, 2, 3})
	for _, q := range [][]float64{{-1e-9, 0.5}, {0.5, 1 + 1e-9}, {math.NaN(), 0}, {0, math.Inf(1)}} {
		f, d1, d2 := make([]float64, 6), make([]float64, 12), make([]float64, 18)
		s.Fill(q, f, d1, d2)
		for _, list := range [][]float64{f, d1, d2} {
			for i, v := range list {
				if !math.IsNaN(v) {
					t.Errorf("shares %v: entry %v is %v, want NaN", q, i, v)
				}
			}
		}
	}
}

// TestNewShapesDoNotAllocate is TestFillDoesNotAllocate for a power and Bernstein
// polynomials, and refuses what does not fit.
func TestNewShapesDoNotAllocate(t *testing.T) {
	b := equalBins(100, 160, 60)
	polynomial := newBernstein(b, []float64{4, 3, 2, 1})
	for _, tt := range []struct {
		name  string
		shape stats.Shape
		q     []float64
	}{
		{"power", newPower(b, 0), []float64{-5.5}},
		{"bernstein", polynomial, polynomial.nominal},
	} {
		n := len(tt.q)
		f, d1, d2 := make([]float64, b.bins), make([]float64, n*b.bins), make([]float64, n*(n+1)/2*b.bins)
		if n := testing.AllocsPerRun(100, func() { tt.shape.Fill(tt.q, f, d1, d2) }); n != 0 {
			t.Errorf("%v: Fill allocates %v times, want 0", tt.name, n)
		}
		func() {
			defer func() {
				if recover() != wrongBins {
					t.Errorf("%v: Fill of 59 bins did not panic with %q", tt.name, wrongBins)
				}
			}()
			tt.shape.Fill(tt.q, f[:59], nil, nil)
		}()
	}
}

const bernsteinScenario = `
[luminosity]
unit = "d"
values = [1]
[[channel]]
name = "peak"
window = [10.0, 20.0]
bins = 25
  [[channel.signal]]
  rate = 5.0
  shape = { kind = "gaussian", mean = 14.0, width = 0.5 }
  [[channel.background]]
  name = "smooth"
  rate = 100.0
  shape = { kind = "bernstein", coefficients = [4, 0, 1.5, 0.5] }
  free = ["rate", "coefficients"]
`

func TestBernsteinScenario(t *testing.T) {
	s, err := read("bernstein.toml", []byte(bernsteinScenario))
	if err != nil {
		t.Fatal(err)
	}
	m := mustModel(t, s, 1)
	// Broken in the order 0, 0.5, 1.5, 4: 0/6, 0.5/6, 1.5/5.5, by hand.
	want := []stats.Param{
		{Name: "peak smooth rate", Nominal: 1, Lower: 0, Upper: math.Inf(1), Step: 0.1},
		{Name: "peak smooth coefficients 2", Lower: 0, Upper: 1, Step: 0.1},
		{Name: "peak smooth coefficients 3", Lower: -1.5 / 5.5, Upper: 4 / 5.5, Step: 0.1},
		{Name: "peak smooth coefficients 4", Lower: -0.5 / 6, Upper: 5.5 / 6, Step: 0.1},
	}
	background := m.Channels[0].Processes[1]
	if len(m.Params) != len(want) || len(background.At) != 3 {
		t.Fatalf("parameters are %+v at %v, want %+v", m.Params, background.At, want)
	}
	yields := s.Yields(1)
	for j, p := range m.Params {
		w := want[j]
		if p.Name != w.Name || p.Constrained || p.Nominal != w.Nominal || !near(p.Step, w.Step) ||
			!(math.Abs(p.Lower-w.Lower) < 1e-15) || !(p.Upper == w.Upper || math.Abs(p.Upper-w.Upper) < 1e-15) {
			t.Errorf("parameter %v is %+v, want %+v", j, p, w)
		}
		if j == 0 {
			continue
		}
		checkEffects(t, p.Name, background.Move[j-1], stats.Effect{Param: j, Lin: 1})
		// A fit puts a parameter at its bounds exactly: they must be inside.
		for _, end := range []float64{p.Lower, p.Upper} {
			q := slices.Clone(background.At)
			q[j-1] += end
			f := make([]float64, 25)
			background.Shape.Fill(q, f, nil, nil)
			if !(f[12] >= 0) {
				t.Errorf("%v at its bound %v gives %v", p.Name, end, f[12])
			}
		}
		y := yields.Parameters[j]
		if y.Name != p.Name || y.Kind != Free || len(y.Effects) != 1 || y.Effects[0] != (Acts{Channel: "peak", Process: "smooth", Moves: "coefficients"}) {
			t.Errorf("yields describe %+v", y)
		}
	}
}

// TestBernsteinBounds: shares stay in [0, 1] to the last digit at both bounds.
func TestBernsteinBounds(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := newBernstein(equalBins(0, 1, 2), drawCoefficients(t))
		for a, u := range s.nominal {
			p := s.parameter("", a)
			if u+p.Lower != 0 || u+p.Upper != 1 {
				t.Fatalf("a share of %v runs from %v to %v", u, u+p.Lower, u+p.Upper)
			}
		}
	})
}

// bestBernstein is the smallest deviance of counts to a sum of Bernstein
// polynomials with coefficients that are not negative, by expectation and
// maximisation (Dempster, Laird, Rubin, J. R. Stat. Soc. B 39 (1977) 1): the
// likelihood is concave in the events of each polynomial, so that its fixed point
// is the one maximum.
func bestBernstein(basis [][]float64, n []float64) float64 {
	events := slices.Repeat([]float64{10}, len(basis))
	lambda := make([]float64, len(n))
	expect := func() {
		clear(lambda)
		for k, f := range basis {
			for i, v := range f {
				lambda[i] += events[k] * v
			}
		}
	}
	for range 20000 {
		expect()
		for k, f := range basis {
			ratio := 0.0
			for i, v := range f {
				ratio += v * n[i] / lambda[i]
			}
			events[k] *= ratio
		}
	}
	expect()
	q := 0.0
	for i, l := range lambda {
		q += 2 * (l - n[i])
		if n[i] > 0 {
			q += 2 * n[i] * math.Log(n[i]/l)
		}
	}
	return q
}

// TestBernsteinFits throws experiments and fits them, with few and with many
// events, from a nominal zero: fits converge, and those without signal find the
// one maximum of the likelihood.
func TestBernsteinFits(t *testing.T) {
	const seed = 20
	s, err := read("bernstein.toml", []byte(bernsteinScenario))
	if err != nil {
		t.Fatal(err)
	}
	basis := bernsteinFractions(s.Channels[0].binning(), 4)
	for _, events := range []float64{30, 10000} {
		m := mustModel(t, s, events/100)
		engine, err := stats.Prepare(m)
		if err != nil {
			t.Fatal(err)
		}
		lambda := engine.Point(0, nil).Lambda
		fitter := engine.Fitter()
		random := rand.New(rand.NewPCG(seed, uint64(events)))
		atZero := 0
		for toy := range 200 {
			d := &stats.Data{N: make([]float64, len(lambda))}
			for i, mean := range lambda {
				d.N[i] = distuv.Poisson{Lambda: mean, Src: random}.Rand()
			}
			free := fitter.Free(d, 0, math.Inf(1))
			if err := free.Status.Err(); err != nil {
				t.Errorf("%v events, toy %v of seed %v: free fit: %v", events, toy, seed, err)
			}
			null := fitter.At(d, 0)
			if err := null.Status.Err(); err != nil {
				t.Errorf("%v events, toy %v of seed %v: fit without signal: %v", events, toy, seed, err)
			}
			fresh := fitter.AtFresh(d, 1)
			if err := fresh.Status.Err(); err != nil {
				t.Errorf("%v events, toy %v of seed %v: fit at 1: %v", events, toy, seed, err)
			}
			if !(free.Deviance <= math.Min(null.Deviance, fresh.Deviance)+1e-6) {
				t.Errorf("%v events, toy %v of seed %v: deviance %v of the free fit, %v and %v at fixed strengths", events, toy, seed, free.Deviance, null.Deviance, fresh.Deviance)
			}
			if free.Mu == 0 {
				atZero++
			}
			if toy >= 40 {
				continue // the reference is slow
			}
			if best := bestBernstein(basis, d.N); !(math.Abs(null.Deviance-best) < 1e-3) {
				t.Errorf("%v events, toy %v of seed %v: deviance %v without signal, expectation and maximisation gives %v", events, toy, seed, null.Deviance, best)
			}
		}
		// Without signal it is fitted at 0 in about half of all experiments; five
		// standard deviations of 200 such choices, which right code leaves for 1 seed
		// in a million.
		if math.Abs(float64(atZero)-100) > 5*math.Sqrt(50) {
			t.Errorf("%v events, seed %v: %v of 200 strengths are 0, want about 100", events, seed, atZero)
		}
	}
}
