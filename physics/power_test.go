package physics

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"
)

func newPower(b binning, origin float64) power {
	return powerKind.make(logarithms(b, Form{Origin: origin})).(power)
}

// growing has bins that become wider from bin to bin.
func growing(low, first, ratio float64, bins int) binning {
	edges := []float64{low}
	for range bins {
		edges = append(edges, edges[len(edges)-1]+first)
		first *= ratio
	}
	return unequalBins(edges)
}

func TestPowerFractions(t *testing.T) {
	for _, tt := range []struct {
		name   string
		b      binning
		origin float64
	}{
		{"spectrum", equalBins(1000, 4000, 60), 0},
		{"unequal bins", growing(20, 1, 1.2, 25), 0},
		{"threshold below the window", equalBins(100, 160, 60), 99},
		{"origin near the window", equalBins(100, 160, 30), 100 - 1e-4},
		{"far from the origin", equalBins(1e9, 1e9+10, 20), 0},
		{"negative masses", equalBins(-160, -100, 60), -200},
		{"four decades", equalBins(0.1, 1000, 50), 0},
		{"one bin", equalBins(1, 2, 1), 0},
	} {
		for _, exponent := range []float64{0, -1, -1 - 1e-13, -1 + 1e-9, -1.001, 0.5, 2, -5.5, 40, -40, 200, -200} {
			t.Run(fmt.Sprintf("%v, exponent %v", tt.name, exponent), func(t *testing.T) {
				f := make([]float64, tt.b.bins)
				newPower(tt.b, tt.origin).Fill([]float64{exponent}, f, nil, nil)
				// The quadrature is over t = ln(x-origin), so that its pieces may be
				// alike everywhere: the density is then exp((exponent+1)·t).
				edges := make([]float64, tt.b.bins+1)
				for i := range edges {
					edges[i] = math.Log((tt.b.edge(i) - tt.origin) / (tt.b.low - tt.origin))
				}
				logarithmic := unequalBins(edges)
				density := func(t float64) float64 { return exponent*t + t }
				peak := math.Max(0, density(logarithmic.high))
				scale := 1 / (1 + math.Abs(exponent))
				if tt.name == "far from the origin" {
					// Differences of those logarithms would lose digits.
					logarithmic, scale = tt.b, 1e9/(1+math.Abs(exponent))
					density = func(x float64) float64 { return exponent * math.Log1p((x-1e9)/1e9) }
					peak = math.Max(0, density(tt.b.high))
				}
				want := fractionsByQuadrature(logarithmic, density, peak, scale, logarithmic.low, logarithmic.high)
				compareFractions(t, f, want)
			})
		}
	}
}

// TestPowerPlainQuadrature is the same over x itself, as the density is defined.
func TestPowerPlainQuadrature(t *testing.T) {
	for _, origin := range []float64{0, 70, -500} {
		for _, b := range []binning{equalBins(100, 160, 60), growing(100, 1, 1.3, 14)} {
			for _, exponent := range []float64{-1, -5.5, 3, 200, -200} {
				f := make([]float64, b.bins)
				newPower(b, origin).Fill([]float64{exponent}, f, nil, nil)
				density := func(x float64) float64 { return exponent * math.Log(x-origin) }
				peak := math.Max(density(b.low), density(b.high))
				scale := (b.low - origin) / (1 + math.Abs(exponent))
				compareFractions(t, f, fractionsByQuadrature(b, density, peak, scale, b.low, b.high))
			}
		}
	}
}

// TestPowerClosedForms: integrals that everybody knows.
func TestPowerClosedForms(t *testing.T) {
	for _, b := range []binning{equalBins(2, 5, 12), growing(2, 0.1, 1.5, 8)} {
		for _, tt := range []struct {
			exponent float64
			integral func(x float64) float64
		}{
			{-1, math.Log},
			{0, func(x float64) float64 { return x }},
			{2, func(x float64) float64 { return x * x * x }},
			{-2, func(x float64) float64 { return -1 / x }},
		} {
			f := make([]float64, b.bins)
			newPower(b, 1).Fill([]float64{tt.exponent}, f, nil, nil)
			whole := tt.integral(b.high-1) - tt.integral(b.low-1)
			for i, v := range f {
				want := (tt.integral(b.edge(i+1)-1) - tt.integral(b.edge(i)-1)) / whole
				if !(math.Abs(v-want) < 1e-13*want) {
					t.Errorf("exponent %v, bin %v: fraction %v, want %v", tt.exponent, i, v, want)
				}
			}
		}
	}
}

func TestPowerDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		if rapid.Bool().Draw(t, "unequal") {
			b = growing(b.low, b.binWidth(), rapid.Float64Range(0.9, 1.1).Draw(t, "ratio"), b.bins)
		}
		below := b.window() * math.Exp(rapid.Float64Range(-6, 6).Draw(t, "log distance of the origin"))
		s := newPower(b, b.low-below)
		length := math.Log1p(b.window() / below)
		steepness := rapid.Float64Range(-500, 500).Draw(t, "(exponent+1)·ln(high/low)")
		if rapid.Bool().Draw(t, "near -1") {
			steepness *= 1e-3
		}
		checkDerivatives(t, s, b.bins, []float64{steepness/length - 1}, []float64{1 / length})
	})
}

// TestPowerScenario reads a power with and without an origin, and bounds its free
// exponent so that no bin underflows.
func TestPowerScenario(t *testing.T) {
	const text = `
[luminosity]
unit = "d"
values = [1]
[[channel]]
name = "peak"
window = [10.0, 20.0]
bins = 5
  [[channel.signal]]
  rate = 5.0
  shape = { kind = "gaussian", mean = 14.0, width = 1.0 }
  [[channel.background]]
  name = "falling"
  rate = 80.0
  shape = { kind = "power", exponent = -2%v }
  free = ["exponent"]
[[uncertainty]]
name = "spectrum"
process = "falling"
moves = "exponent"
shift = 0.25
`
	for _, tt := range []struct {
		key    string
		origin float64
	}{{"", 0}, {", origin = 9", 9}, {", origin = -10", -10}} {
		s, err := read("power.toml", fmt.Appendf(nil, text, tt.key))
		if err != nil {
			t.Fatal(err)
		}
		m := mustModel(t, s, 1)
		background := m.Channels[0].Processes[1]
		f := make([]float64, 5)
		background.Shape.Fill(background.At, f, nil, nil)
		whole := 1/(10-tt.origin) - 1/(20-tt.origin)
		for i, v := range f {
			x := 10 + 2*float64(i)
			want := (1/(x-tt.origin) - 1/(x+2-tt.origin)) / whole
			if !(math.Abs(v-want) < 1e-13) {
				t.Errorf("origin %v, bin %v: fraction %v, want %v", tt.origin, i, v, want)
			}
		}
		free := m.Params[0]
		if free.Name != "peak falling exponent" || free.Nominal != 0 || !(free.Step > 0) {
			t.Errorf("free exponent is %+v", free)
		}
		for _, end := range []float64{free.Lower, free.Upper} {
			background.Shape.Fill([]float64{background.At[0] + end}, f, nil, nil)
			for i, v := range f {
				if !(v > 0) {
					t.Errorf("origin %v: bin %v holds %v at the bound %v", tt.origin, i, v, end)
				}
			}
		}
		if move := background.Move[0]; len(move) != 2 || move[0].Lin != 1 || move[1].Lin != 0.25 {
			t.Errorf("exponent is moved by %+v, want 1 of the free one and 0.25", move)
		}
		if a := s.Yields(1).Parameters[1].Effects[0]; a.Moves != "exponent" || a.Shift != 0.25 || a.Size != "+0.25" {
			t.Errorf("spectrum acts as %+v", a)
		}
	}
}
