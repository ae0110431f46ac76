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

	want := []Parameter{
		{"two-photon continuum rate", Free, []Acts{{"two-photon", "continuum", "rate", ""}}},
		{"two-photon continuum slope", Free, []Acts{{"two-photon", "continuum", "slope", ""}}},
		{"fakes rate", Tied, []Acts{{"tau count", "fakes", "rate", ""}, {"tau control", "fakes", "rate", ""}}},
		{"photon efficiency", Constrained, []Acts{{"two-photon", "signal", "rate", "+3 %"}}},
		{"photon energy scale", Constrained, []Acts{{"two-photon", "signal", "mean", "+0.4 GeV"}}},
		{"fake rate", Constrained, []Acts{{"tau count", "fakes", "rate", "+20 %"}, {"tau count", "signal", "rate", "-5 %"}}},
	}
	if !reflect.DeepEqual(y.Parameters, want) {
		t.Errorf("parameters are\n%+v, want\n%+v", y.Parameters, want)
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
