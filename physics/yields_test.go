package physics

import (
	"math"
	"path/filepath"
	"reflect"
	"testing"
)

func TestYields(t *testing.T) {
	s := mustRead(t, filepath.Join("testdata", "ostvik.toml"))
	s.Channels[0].Unit = "GeV"
	y := s.Yields(20)
	if y.Luminosity != 20 || y.Unit != "fb⁻¹" || len(y.Channels) != 3 {
		t.Fatalf("Yields(20) = %+v, want three channels at 20 fb⁻¹", y)
	}
	c := y.Channels[0]
	if c.Signals[0].Events != 220 || c.Backgrounds[0].Events != 16800 || c.Backgrounds[0].Form.Kind != "exponential" {
		t.Errorf("two-photon expects %+v and %+v, want 220 and 16800 events", c.Signals, c.Backgrounds)
	}
	// A peak over a flat background stands out most within 1.4 widths, where
	// erf(x/√2)/√x is largest (calculus); this background falls slowly.
	if c.Best == nil || math.Abs(c.Best.Low-(140-1.4*1.7)) > 1 || math.Abs(c.Best.High-(140+1.4*1.7)) > 1 {
		t.Fatalf("two-photon stands out in %+v, want about 137.6 to 142.4", c.Best)
	}
	// Signal between the edges by erf, background by the exponential's integral.
	peak := func(x float64) float64 { return 0.5 * math.Erf((x-140)/1.7/math.Sqrt2) }
	smooth := func(x float64) float64 { return math.Exp(-0.028*(x-110)) / math.Expm1(-0.028*60) }
	signal := 220 * (peak(c.Best.High) - peak(c.Best.Low))
	background := 16800 * (smooth(c.Best.High) - smooth(c.Best.Low))
	if math.Abs(c.Best.Signal/signal-1) > 1e-9 || math.Abs(c.Best.Background/background-1) > 1e-9 {
		t.Errorf("two-photon holds %v and %v events there, want %v and %v", c.Best.Signal, c.Best.Background, signal, background)
	}
	if first := int(c.Best.Low - 110); c.Best.FirstBin != first || c.Best.Bins != int(c.Best.High-c.Best.Low) {
		t.Errorf("two-photon stands out in %v bins from %v, want edges %v to %v", c.Best.Bins, c.Best.FirstBin, c.Best.Low, c.Best.High)
	}
	// The fullest bin touches the mean, with 0.2217 of the signal; 145 to 146 holds
	// 1.4e-3 and the bin above it 1.9e-4 (normal tails beyond 2.94, 3.53, 4.12).
	if low := 16800 * (smooth(146) - smooth(145)); math.Abs(c.SmallestBackground/low-1) > 1e-9 || c.SmallestTotal <= c.SmallestBackground {
		t.Errorf("two-photon: smallest expectation %v and %v, want %v from 145 to 146, and more with signal", c.SmallestBackground, c.SmallestTotal, low)
	}

	count, control := y.Channels[1], y.Channels[2]
	if count.Best == nil || count.Best.Signal != 28 || count.Best.Background != 60 || !math.IsNaN(count.Best.Low) {
		t.Errorf("tau count stands out in %+v, want 28 and 60 events without edges", count.Best)
	}
	if count.SmallestBackground != 60 || count.SmallestTotal != 88 {
		t.Errorf("tau count: smallest expectation %v and %v, want 60 and 88", count.SmallestBackground, count.SmallestTotal)
	}
	if control.Best != nil || !math.IsNaN(control.SmallestTotal) || control.Backgrounds[0].Events != 480 {
		t.Errorf("tau control is %+v, want 480 events of background alone", control)
	}

	described := func(name string, kind ParameterKind, effects ...Acts) Parameter {
		return Parameter{Name: name, Kind: kind, Scale: 1, Effects: effects}
	}
	want := []Parameter{
		described("two-photon continuum rate", Free, Acts{Channel: "two-photon", Process: "continuum", Moves: "rate"}),
		described("two-photon continuum slope", Free, Acts{Channel: "two-photon", Process: "continuum", Moves: "slope"}),
		described("fakes rate", Tied, Acts{Channel: "tau count", Process: "fakes", Moves: "rate"}, Acts{Channel: "tau control", Process: "fakes", Moves: "rate"}),
		described("photon efficiency", Constrained, Acts{Channel: "two-photon", Process: "signal", Moves: "rate", Size: "+3 %", Up: 1.03, Down: 1 / 1.03}),
		described("photon energy scale", Constrained, Acts{Channel: "two-photon", Process: "signal", Moves: "mean", Size: "+0.4 GeV", Shift: 0.4}),
		described("fake rate", Constrained, Acts{Channel: "tau count", Process: "fakes", Moves: "rate", Size: "+20 %", Up: 1.2, Down: 1 / 1.2},
			Acts{Channel: "tau count", Process: "signal", Moves: "rate", Size: "−5 %", Up: 0.95, Down: 1 / 0.95}),
	}
	for i := range want {
		for k := range want[i].Effects {
			got, exact := &y.Parameters[i].Effects[k], &want[i].Effects[k]
			if math.Abs(got.Up-exact.Up) > 1e-15 || math.Abs(got.Down-exact.Down) > 1e-15 {
				t.Errorf("%v: factors %v and %v, want %v and %v", want[i].Name, got.Up, got.Down, exact.Up, exact.Down)
			}
			got.Up, got.Down = exact.Up, exact.Down
		}
	}
	if !reflect.DeepEqual(y.Parameters, want) {
		t.Errorf("parameters are\n%+v, want\n%+v", y.Parameters, want)
	}
}

// TestYieldsUncertain holds the sizes at 32 d, where efficiency counts by half
// and radon by sqrt(0.25 + 0.75/4) = 0.6614, to powers of the factors: with
// g(x) = (3x² - x⁴)/2 they are up^((g+x)/2) · down^((g-x)/2).
func TestYieldsUncertain(t *testing.T) {
	y := uncertain(t).Yields(32)
	powers := func(up, down, x float64) float64 {
		g := (3*x*x - x*x*x*x) / 2
		return math.Pow(up, (g+x)/2) * math.Pow(down, (g-x)/2)
	}
	radon := math.Sqrt(0.25 + 0.75/4)
	for _, tt := range []struct {
		parameter, effect int
		name, moves, size string
		up, down, shift   float64
	}{
		{1, 0, "efficiency", "rate", "+10.78 % / −6.001 %", powers(1.25, 0.9, 0.5), powers(1.25, 0.9, -0.5), 0},
		{2, 2, "radon", "rate", "+5.026 % / +11.25 %", powers(1.1, 1.2, radon), powers(1.1, 1.2, -radon), 0},
		{2, 4, "radon", "rate", "+18.95 %", math.Pow(1.3, radon), math.Pow(1.3, -radon), 0},
		{3, 2, "calibration", "mean", "+0.25 keV", 0, 0, 0.25},
		// From 40, 30, 20, 10 to 30, 30, 20, 20 and back to the very same.
		{3, 0, "calibration", "template", "−25 … +100 % / +0 … +0 %", 0, 0, 0},
	} {
		p := y.Parameters[tt.parameter]
		a := p.Effects[tt.effect]
		if p.Name != tt.name || a.Moves != tt.moves || a.Size != tt.size || a.Shift != tt.shift ||
			math.Abs(a.Up-tt.up) > 1e-14 || math.Abs(a.Down-tt.down) > 1e-14 {
			t.Errorf("effect %v of parameter %v is %q, %+v, want %+v", tt.effect, tt.parameter, p.Name, a, tt)
		}
	}
	for i, want := range []Parameter{
		{Name: "bulk dust rate", Kind: Free, Scale: 1},
		{Name: "efficiency", Kind: Constrained, Shrinks: true, Scale: 0.5},
		{Name: "radon", Kind: Constrained, Shrinks: true, Scale: radon},
		{Name: "calibration", Kind: Constrained, Scale: 1},
	} {
		got := y.Parameters[i]
		if got.Effects = nil; !reflect.DeepEqual(got, want) {
			t.Errorf("parameter %v is %+v, want %+v", i, got, want)
		}
	}
	if len(y.Parameters) != 4 {
		t.Errorf("there are %v parameters, want 4", len(y.Parameters))
	}

	// From 40, 30, 20, 10 to 60, 20, 15, 5 and to 30, 30, 20, 20, by hand.
	if size := uncertain(t).Yields(8).Parameters[2].Effects[0].Size; size != "−50 … +50 % / −25 … +100 %" {
		t.Errorf("radon moves the template by %q", size)
	}

	// At 32 d, four times 8, what has no floor is halved.
	shrinking := uncertain(t)
	shrinking.Uncertainties[2].MeasuredAt = 8
	if a := shrinking.Yields(32).Parameters[3].Effects[2]; a.Shift != 0.125 || a.Size != "+0.125 keV" {
		t.Errorf("a shift of 0.25 shrunk to half is %+v", a)
	}

	// Relative errors by hand: 0.6/6 and sqrt(1.09)/5; 0.2/1 and 0.3/1; 0.2.
	for i, want := range []*Simulation{{3, 0.1, math.Sqrt(1.09) / 5}, {3, 0.15, 0.3}, {1, 0.2, 0.2}} {
		got := y.Channels[i].Simulation
		if got == nil || got.Factors != want.Factors || math.Abs(got.Smallest-want.Smallest) > 1e-15 || math.Abs(got.Largest-want.Largest) > 1e-15 {
			t.Errorf("simulation of channel %v is %+v, want %+v", i, got, want)
		}
	}
	if c := Demo().Yields(1).Channels[0]; c.Simulation != nil {
		t.Errorf("the demonstration has the simulation %+v, want none", c.Simulation)
	}
}

// TestDemo: the demonstration's formulas, bin by bin without any nuisance
// parameter, sqrt(2((s+b)ln(1+s/b)-s)) (Cowan, Cranmer, Gross, Vitells, Eur.
// Phys. J. C71 (2011) 1554, equation 97), put 5σ near 22 fb⁻¹, inside its list,
// and every search adds to it.
func TestDemo(t *testing.T) {
	s := Demo()
	if s.Source != "demonstration" || len(s.SHA256) != 64 || DemoText() != demoText {
		t.Errorf("source %q, sum %q", s.Source, s.SHA256)
	}
	significance := func(luminosity float64) (each []float64, all float64) {
		m := mustModel(t, s, luminosity)
		for _, c := range m.Channels {
			signal, background := make([]float64, c.Bins), make([]float64, c.Bins)
			for _, p := range c.Processes {
				f := []float64{1}
				if p.Shape != nil {
					f = make([]float64, c.Bins)
					p.Shape.Fill(p.At, f, nil, nil)
				}
				for bin, v := range f {
					if p.Signal {
						signal[bin] += p.Yield * v
					} else {
						background[bin] += p.Yield * v
					}
				}
			}
			q := 0.0
			for bin, b := range background {
				q += 2 * ((signal[bin]+b)*math.Log1p(signal[bin]/b) - signal[bin])
			}
			each = append(each, math.Sqrt(q))
			all += q
		}
		return each, math.Sqrt(all)
	}
	if _, z := significance(10); z >= 5 {
		t.Errorf("z is %v at 10, want below 5", z)
	}
	each, z := significance(25)
	if z < 5 {
		t.Errorf("z is %v at 25, want above 5", z)
	}
	for i, channel := range each[:3] {
		if channel < 2 {
			t.Errorf("channel %q gives z = %v at 25, want at least 2", s.Channels[i].Name, channel)
		}
	}
}
