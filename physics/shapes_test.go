package physics

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"lumireach/stats"
	"pgregory.net/rapid"
)

// fractionsByQuadrature integrates exp(logDensity) over each bin with a general
// purpose Gauss-Legendre rule (gonum, integrate/quad) in pieces no longer than
// scale, leaving out what lies outside [from, to]. peak is the largest
// logarithm in the window.
func fractionsByQuadrature(b binning, logDensity func(float64) float64, peak, scale, from, to float64) []float64 {
	f := make([]float64, b.bins)
	total := 0.0
	for i := range f {
		low, high := math.Max(b.edge(i), from), math.Min(b.edge(i+1), to)
		if !(high > low) {
			continue
		}
		pieces := int(math.Ceil((high - low) / scale))
		for k := range pieces {
			x0 := low + (high-low)*float64(k)/float64(pieces)
			x1 := low + (high-low)*float64(k+1)/float64(pieces)
			f[i] += quad.Fixed(func(x float64) float64 { return math.Exp(logDensity(x) - peak) }, x0, x1, 20, quad.Legendre{}, 0)
		}
		total += f[i]
	}
	for i := range f {
		f[i] /= total
	}
	return f
}

func compareFractions(t *testing.T, got, want []float64) {
	t.Helper()
	sum := 0.0
	for i := range got {
		sum += got[i]
		// Below 1e-290 a fraction may have lost digits or be left out.
		if !(math.Abs(got[i]-want[i]) <= 1e-9*want[i]+1e-290) {
			t.Errorf("bin %v: fraction %v, quadrature gives %v", i, got[i], want[i])
		}
	}
	if !(math.Abs(sum-1) < 1e-12) {
		t.Errorf("fractions sum to %v, want 1", sum)
	}
}

func TestGaussianFractions(t *testing.T) {
	for _, tt := range []struct {
		name        string
		b           binning
		mean, width float64
	}{
		{"peak in a window", equalBins(100, 160, 60), 126, 1.6},
		{"mean at an edge", equalBins(100, 160, 60), 126, 0.8},
		{"mean at the low end", equalBins(100, 160, 60), 100, 3},
		{"mean at the high end", equalBins(100, 160, 60), 160, 3},
		{"between two edges", equalBins(0, 10, 10), 4.3, 0.5},
		{"narrow against a bin", equalBins(0, 10, 10), 4.3, 0.02},
		{"narrow beside an edge", equalBins(0, 10, 10), 4.0001, 0.001},
		{"below the window", equalBins(100, 160, 60), 80, 7},
		{"above the window", equalBins(100, 160, 60), 200, 9},
		{"window in the tail beyond 33 widths", equalBins(33, 34, 20), 0, 1},
		{"window in the tail below -33 widths", equalBins(-34, -33, 20), 0, 1},
		{"bins of three widths", equalBins(-30, 30, 20), 1, 1},
		{"wider than the window", equalBins(100, 160, 60), 126, 300},
		{"a thousand windows wide", equalBins(100, 160, 60), 126, 6e4},
		{"a million windows wide", equalBins(100, 160, 60), -500, 6e7},
		{"wide, narrow bins, in the tail", equalBins(30, 30.5, 1000), 0, 1},
		{"wide, narrow bins, in the low tail", equalBins(-30.5, -30, 1000), 0, 1},
		{"many bins", equalBins(-5, 5, 9000), 0.1, 1},
		{"negative masses", equalBins(-160, -100, 60), -126, 1.6},
		{"one bin", equalBins(100, 160, 1), 126, 1.6},
		{"unequal bins", unequalBins([]float64{100, 101, 110, 120, 124, 125, 125.5, 126.2, 128, 160}), 126, 1.6},
		{"unequal bins, far in the tail", unequalBins([]float64{20, 21, 21.5, 24, 30}), 0, 1},
		{"unequal bins, some of them tiny", unequalBins([]float64{0, 3, 3.0001, 3.0002, 4, 7}), 3.2, 1},
		{"unequal bins, wider than the window", unequalBins([]float64{0, 3, 3.5, 4, 7}), 3.2, 500},
	} {
		t.Run(tt.name, func(t *testing.T) {
			f := make([]float64, tt.b.bins)
			gaussianKind.make(tt.b).Fill([]float64{tt.mean, math.Log(tt.width)}, f, nil, nil)
			density := func(x float64) float64 {
				z := (x - tt.mean) / tt.width
				return -0.5 * z * z
			}
			nearest := math.Max(tt.b.low, math.Min(tt.mean, tt.b.high))
			want := fractionsByQuadrature(tt.b, density, density(nearest), tt.width/2, tt.mean-40*tt.width, tt.mean+40*tt.width)
			compareFractions(t, f, want)
		})
	}
}

func TestExponentialFractions(t *testing.T) {
	for _, b := range []binning{equalBins(100, 160, 60), equalBins(-3, 5, 7), equalBins(0, 1, 1000), equalBins(10, 20, 1),
		unequalBins([]float64{0, 1, 1.5, 4, 4.001, 9, 30})} {
		for _, steepness := range []float64{0, 1e-300, 1e-12, -1e-6, 0.1, -1.7, 30, -300, 690, -690} {
			slope := steepness / b.window()
			f := make([]float64, b.bins)
			exponentialKind.make(b).Fill([]float64{slope}, f, nil, nil)
			density := func(x float64) float64 { return slope * (x - b.low) }
			peak := math.Max(0, slope*b.window())
			scale := b.window() / (1 + math.Abs(steepness))
			want := fractionsByQuadrature(b, density, peak, scale, b.low, b.high)
			compareFractions(t, f, want)
			if t.Failed() {
				t.Fatalf("window %v, slope·window %v", b, steepness)
			}
		}
	}
}

// TestDecayMoments compares with a Gauss-Legendre rule (gonum, integrate/quad) that
// is exact to rounding for these.
func TestDecayMoments(t *testing.T) {
	for _, decays := range []float64{0, 1e-9, -1e-9, 0.003, 0.1, 0.199, 0.201, -0.19, -0.3, 1, -4, 12, 30, -30} {
		moment := func(power, about float64) float64 {
			return quad.Fixed(func(y float64) float64 {
				return math.Pow(y-about, power) * math.Exp(-decays*y)
			}, 0, 1, 60, quad.Legendre{}, 0)
		}
		whole := moment(0, 0)
		if got := decay(decays); !(math.Abs(got/whole-1) < 2e-14) {
			t.Errorf("decay(%v) = %v, want %v", decays, got, whole)
		}
		mean := moment(1, 0) / whole
		variance := moment(2, mean) / whole
		gotMean, gotVariance := decayMoments(decays)
		if !(math.Abs(gotMean/mean-1) < 2e-14) || !(math.Abs(gotVariance/variance-1) < 2e-13) {
			t.Errorf("decayMoments(%v) = %v, %v, want %v, %v", decays, gotMean, gotVariance, mean, variance)
		}
	}
}

// TestLongWindowsDoNotDrift holds the recurrences, which start anew from time
// to time, to the functions that they stand for.
func TestLongWindowsDoNotDrift(t *testing.T) {
	const bins = 10000
	f := make([]float64, bins)
	for _, slope := range []float64{-0.7, -1, -2.9, -17} {
		exponentialKind.make(equalBins(0, 1, bins)).Fill([]float64{slope}, f, nil, nil)
		for i, v := range f {
			want := f[0] * math.Exp(slope*float64(i)/bins)
			if !(math.Abs(v/want-1) < 2e-14) {
				t.Fatalf("exponential of slope %v: bin %v holds %v, want %v", slope, i, v, want)
			}
		}
	}
	gaussianKind.make(equalBins(0, 10.5, bins)).Fill([]float64{0, 0}, f, nil, nil)
	last := 1.0
	for i, v := range f {
		next := math.Erfc(10.5 * float64(i+1) / bins / math.Sqrt2)
		// Both sides are differences of tails that are good to some 2⁻⁵³·z².
		z := 10.5 * float64(i) / bins
		if want := last - next; !(math.Abs(v-want) < 2e-15*(4+z*z)*last) {
			t.Fatalf("gaussian: bin %v holds %v, want %v", i, v, want)
		}
		last = next
	}
}

func TestFixedFractions(t *testing.T) {
	f := make([]float64, 4)
	uniform{equalBins(100, 160, 4)}.Fill(nil, f, nil, nil)
	for i, v := range f {
		if v != 0.25 {
			t.Errorf("uniform: bin %v holds %v, want 0.25", i, v)
		}
	}
	uniform{unequalBins([]float64{0, 1, 3, 4, 8})}.Fill(nil, f, nil, nil)
	for i, want := range []float64{0.125, 0.25, 0.125, 0.5} {
		if f[i] != want {
			t.Errorf("uniform: bin %v holds %v, want %v", i, f[i], want)
		}
	}
	newTemplate([]float64{1.6e308, 0, 0.8e308, 0.8e308}).Fill(nil, f, nil, nil)
	for i, want := range []float64{0.5, 0, 0.25, 0.25} {
		if math.Abs(f[i]-want) > 1e-15 {
			t.Errorf("template: bin %v holds %v, want %v", i, f[i], want)
		}
	}
}

// checkDerivatives compares the derivatives of a shape with five-point central
// differences (Abramowitz and Stegun, formula 25.3.6: error h⁴f⁽⁵⁾/30) in steps
// of h times the natural unit of each quantity.
func checkDerivatives(t *rapid.T, shape stats.Shape, bins int, q, unit []float64) {
	const h = 1e-3
	n := len(q)
	f := make([]float64, bins)
	d1 := make([]float64, n*bins)
	d2 := make([]float64, n*(n+1)/2*bins)
	for _, list := range [][]float64{f, d1, d2} { // nothing may be left as it was
		for i := range list {
			list[i] = math.NaN()
		}
	}
	shape.Fill(q, f, d1, d2)

	alone := make([]float64, bins)
	shape.Fill(q, alone, nil, nil)
	for i := range f {
		if f[i] != alone[i] {
			t.Fatalf("bin %v: fraction %v with derivatives, %v without", i, f[i], alone[i])
		}
	}

	pair := 0
	moved := make([]float64, n)
	for a := range n {
		first := make([]float64, bins)
		gradient := make([]float64, n*bins)
		for _, point := range []struct{ step, weight float64 }{{-2, 1. / 12}, {-1, -8. / 12}, {1, 8. / 12}, {2, -1. / 12}} {
			copy(moved, q)
			moved[a] += point.step * h * unit[a]
			g := make([]float64, bins)
			g1 := make([]float64, n*bins)
			shape.Fill(moved, g, g1, make([]float64, len(d2)))
			for i := range first {
				first[i] += point.weight / h * g[i]
			}
			for i := range gradient {
				gradient[i] += point.weight / h * g1[i]
			}
		}
		scaled := make([]float64, bins)
		for i := range scaled {
			scaled[i] = d1[a*bins+i] * unit[a]
		}
		compareDerivatives(t, "first", scaled, first)
		for b := a; b < n; b++ {
			second := make([]float64, bins)
			for i := range second {
				scaled[i] = d2[pair*bins+i] * unit[a] * unit[b]
				second[i] = gradient[b*bins+i] * unit[b]
			}
			compareDerivatives(t, "second", scaled, second)
			pair++
		}
	}
}

func compareDerivatives(t *rapid.T, order string, got, want []float64) {
	largest, sum := 0.0, 0.0
	for i := range want {
		largest = math.Max(largest, math.Abs(want[i]))
		sum += got[i]
	}
	// A wide gaussian has fractions good to 1e-13 (2⁻⁵³ over bins of 1e-3
	// widths), of which a step of h makes 1e-10.
	tolerance := 1e-6*largest + 1e-9
	for i := range want {
		if !(math.Abs(got[i]-want[i]) <= tolerance) {
			t.Fatalf("%v derivative of bin %v: %v, differences give %v (largest %v)", order, i, got[i], want[i], largest)
		}
	}
	if !(math.Abs(sum) <= tolerance) {
		t.Fatalf("%v derivatives sum to %v, want 0: the fractions always sum to 1", order, sum)
	}
}

func drawBinning(t *rapid.T) binning {
	low := rapid.Float64Range(-200, 200).Draw(t, "low")
	b := equalBins(low, low+rapid.Float64Range(0.1, 100).Draw(t, "window"), rapid.IntRange(1, 80).Draw(t, "bins"))
	if !rapid.Bool().Draw(t, "unequal") {
		return b
	}
	edges := []float64{b.low}
	for i := 1; i < b.bins; i++ {
		edges = append(edges, b.edge(i)+0.4*b.binWidth()*rapid.Float64Range(-1, 1).Draw(t, "shift"))
	}
	return unequalBins(append(edges, b.high))
}

func TestGaussianDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		// From a fifth of a bin to far beyond the window, over both ways of
		// computing; or at an edge between bins so wide that both tails end in
		// the next.
		width := b.binWidth() * math.Exp(rapid.Float64Range(math.Log(0.2), math.Log(1e4)).Draw(t, "log width in bins"))
		mean := b.low + b.window()*rapid.Float64Range(0, 1).Draw(t, "place")
		outside := width * rapid.Float64Range(-8, 8).Draw(t, "outside")
		if rapid.Bool().Draw(t, "narrow") {
			b = equalBins(0, float64(b.bins), b.bins) // where the mean's rounding is small against the width
			width = b.binWidth() * rapid.Float64Range(0.005, 0.03).Draw(t, "width in bins")
			mean = b.edge(rapid.IntRange(0, b.bins).Draw(t, "edge"))
			outside = width * rapid.Float64Range(-3, 3).Draw(t, "outside")
		}
		mean += outside
		checkDerivatives(t, gaussianKind.make(b), b.bins, []float64{mean, math.Log(width)}, []float64{width, 1})
	})
}

func TestExponentialDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		steepness := rapid.Float64Range(-500, 500).Draw(t, "slope·window")
		if rapid.Bool().Draw(t, "shallow") {
			steepness *= 1e-3
		}
		checkDerivatives(t, exponentialKind.make(b), b.bins, []float64{steepness / b.window()}, []float64{1 / b.window()})
	})
}

// TestGaussianPathsAgree holds the two ways of computing together where one
// takes over from the other, far from the mean as well.
func TestGaussianPathsAgree(t *testing.T) {
	b := equalBins(0, 1, 40)
	s := gaussianKind.make(b).(gaussian)
	for _, far := range []float64{0, 0.5, -3, 20} {
		width := b.binWidth() / 1.0001e-3
		q := []float64{0.3 + far*width, math.Log(width)}
		edges, wide := make([][]float64, 3), make([][]float64, 3)
		for i, n := range []int{1, 2, 3} {
			edges[i], wide[i] = make([]float64, n*b.bins), make([]float64, n*b.bins)
		}
		s.Fill(q, edges[0], edges[1], edges[2])
		var t1 [2]float64
		var t2 [3]float64
		total := s.fillWide(q[0], 1/width, wide[0], wide[1], wide[2], &t1, &t2)
		normalise(wide[0], wide[1], wide[2], total, t1[:], t2[:])
		for order := range edges {
			largest := 0.0
			for _, v := range wide[order] {
				largest = math.Max(largest, math.Abs(v))
			}
			// The second derivatives lose the most digits to cancellation.
			tolerance := []float64{1e-10, 1e-8, 1e-6}[order] * largest
			for i, v := range wide[order] {
				if !(math.Abs(v-edges[order][i]) <= tolerance) {
					t.Errorf("mean %v widths away, derivative %v, entry %v: %v over edges, %v over the density", far, order, i, edges[order][i], v)
				}
			}
		}
	}
}

// TestMills compares the table with erfc of the standard library.
func TestMills(t *testing.T) {
	for i := range 37500 {
		z := float64(i)/1000 + 1e-4
		if z > farthest {
			break
		}
		got := normalDensity(z) * mills(z*millsSteps)
		want := 0.5 * math.Erfc(z/math.Sqrt2)
		// The argument of the exponential is rounded to z²/2 · 2⁻⁵³, in both.
		if tolerance := 1e-15 * (4 + z*z); !(math.Abs(got/want-1) < tolerance) {
			t.Fatalf("tail beyond %v: %v, erfc gives %v", z, got, want)
		}
	}
}

func TestUndefinedShapes(t *testing.T) {
	b := equalBins(100, 160, 6)
	for _, tt := range []struct {
		name  string
		shape stats.Shape
		q     []float64
	}{
		{"peak far above", gaussianKind.make(b), []float64{400, 0}},
		{"peak far below", gaussianKind.make(b), []float64{-400, 0}},
		{"wide peak farther still", gaussianKind.make(b), []float64{-1e9, math.Log(1e7)}},
		{"mean not a number", gaussianKind.make(b), []float64{math.NaN(), 0}},
		{"infinite mean", gaussianKind.make(b), []float64{math.Inf(1), 0}},
		{"width not a number", gaussianKind.make(b), []float64{126, math.NaN()}},
		{"infinite width", gaussianKind.make(b), []float64{126, math.Inf(1)}},
		{"no width", gaussianKind.make(b), []float64{126, math.Inf(-1)}},
		{"no power", newCrystalBall(b, true, false), []float64{126, 0, 0, math.Inf(-1)}},
		{"power not a number", newCrystalBall(b, true, false), []float64{126, 0, 0, math.NaN()}},
		{"infinite power", newCrystalBall(b, true, false), []float64{126, 0, 0, math.Inf(1)}},
		{"alpha not a number", newCrystalBall(b, false, true), []float64{126, 0, math.NaN(), 1}},
		{"infinite alpha", newCrystalBall(b, false, true), []float64{126, 0, math.Inf(1), 1}},
		{"no alpha", newCrystalBall(b, false, true), []float64{126, 0, math.Inf(-1), 1}},
		{"side without a tail far away", newCrystalBall(b, false, true), []float64{400, 0, 0, 1}},
		{"tail of no width", newCrystalBall(b, true, false), []float64{126, math.Inf(-1), 0, 1}},
		{"edges infinitely many widths away", newCrystalBall(b, true, true), []float64{1e300, -300, 0, 1e-200, 0, 1e-200}},
		{"voigt, edges infinitely many widths away", voigtKind.make(b), []float64{1e300, -300, 0}},
		{"voigt of mean not a number", voigtKind.make(b), []float64{math.NaN(), 0, 0}},
		{"voigt of no width", voigtKind.make(b), []float64{126, math.Inf(-1), 0}},
		{"no natural width", voigtKind.make(b), []float64{126, 0, math.Inf(-1)}},
		{"infinite natural width", voigtKind.make(b), []float64{126, 0, math.Inf(1)}},
		{"natural width not a number", voigtKind.make(b), []float64{126, 0, math.NaN()}},
		{"slope not a number", exponentialKind.make(b), []float64{math.NaN()}},
		{"infinite slope", exponentialKind.make(b), []float64{math.Inf(-1)}},
	} {
		n := len(tt.q)
		f := make([]float64, b.bins)
		d1 := make([]float64, n*b.bins)
		d2 := make([]float64, n*(n+1)/2*b.bins)
		tt.shape.Fill(tt.q, f, d1, d2)
		for _, list := range [][]float64{f, d1, d2} {
			for i, v := range list {
				if !math.IsNaN(v) {
					t.Errorf("%v: entry %v is %v, want NaN", tt.name, i, v)
				}
			}
		}
	}
}

func TestFillDoesNotAllocate(t *testing.T) {
	b := equalBins(100, 160, 60)
	f := make([]float64, b.bins)
	d1 := make([]float64, 6*b.bins)
	d2 := make([]float64, 21*b.bins)
	for _, tt := range []struct {
		name  string
		shape stats.Shape
		q     []float64
	}{
		{"gaussian", gaussianKind.make(b), []float64{126, 0.5}},
		{"wide gaussian", gaussianKind.make(b), []float64{126, 10}},
		{"exponential", exponentialKind.make(b), []float64{-0.03}},
		{"crystal-ball", newCrystalBall(b, true, true), []float64{126, 0.5, 0.3, 1, 0.2, 2}},
		{"wide crystal-ball", newCrystalBall(b, true, true), []float64{126, 10, 0.3, 1, 0.2, 2}},
		{"voigt", voigtKind.make(b), []float64{126, 0.5, 0.3}},
		{"uniform", uniformKind.make(b), nil},
		{"template", newTemplate(firstBinOnly(b.bins)), nil},
	} {
		if n := testing.AllocsPerRun(100, func() { tt.shape.Fill(tt.q, f, d1[:len(tt.q)*b.bins], d2[:len(tt.q)*(len(tt.q)+1)/2*b.bins]) }); n != 0 {
			t.Errorf("%v: Fill allocates %v times, want 0", tt.name, n)
		}
	}
}

func firstBinOnly(bins int) []float64 {
	events := make([]float64, bins)
	events[0] = 1
	return events
}

func TestFillWrongBinsPanics(t *testing.T) {
	b := equalBins(100, 160, 60)
	for _, shape := range []stats.Shape{gaussianKind.make(b), exponentialKind.make(b), uniformKind.make(b), newTemplate(firstBinOnly(60)),
		newCrystalBall(b, false, false), voigtKind.make(b)} {
		func() {
			defer func() {
				if recover() != wrongBins {
					t.Errorf("%T.Fill of 59 bins did not panic with %q", shape, wrongBins)
				}
			}()
			shape.Fill([]float64{126, 0, 0}, make([]float64, 59), nil, nil)
		}()
	}
}
