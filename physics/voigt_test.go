package physics

import (
	"math"
	"math/big"
	"testing"

	"pgregory.net/rapid"
)

// bigComplex is a complex number of some 75 digits.
type bigComplex struct{ re, im *big.Float }

func newBig(x float64) *big.Float { return new(big.Float).SetPrec(250).SetFloat64(x) }

func (a bigComplex) times(b bigComplex) bigComplex {
	part := func(p, q, r, s *big.Float, sign float64) *big.Float {
		second := newBig(sign)
		second.Mul(second, newBig(0).Mul(r, s))
		return second.Add(second, newBig(0).Mul(p, q))
	}
	return bigComplex{part(a.re, b.re, a.im, b.im, -1), part(a.re, b.im, a.im, b.re, 1)}
}

func (a bigComplex) plus(b bigComplex) bigComplex {
	return bigComplex{newBig(0).Add(a.re, b.re), newBig(0).Add(a.im, b.im)}
}

func (a bigComplex) scaled(factor *big.Float) bigComplex {
	return bigComplex{newBig(0).Mul(a.re, factor), newBig(0).Mul(a.im, factor)}
}

// powerSeries is w(z) = Σ (iz)ⁿ/Γ(n/2+1), DLMF 7.6.3, with two derivatives by
// w' = -2zw + 2i/√π. Its terms reach exp(|z|²).
func powerSeries(x, y float64) (w, d1, d2 complex128) {
	root, _, err := big.ParseFloat("0.56418958354775628694807945156077258584405062932899885684408572171", 10, 250, big.ToNearestEven)
	if err != nil {
		panic(err)
	}
	z := bigComplex{newBig(x), newBig(y)}
	turned := bigComplex{newBig(-y), newBig(x)}
	square := turned.times(turned)
	even := bigComplex{newBig(1), newBig(0)}
	odd := turned.scaled(newBig(0).Mul(root, newBig(2)))
	sum := even.plus(odd)
	for k := 1; k < 400; k++ {
		even = even.times(square).scaled(newBig(0).Quo(newBig(1), newBig(float64(k))))
		odd = odd.times(square).scaled(newBig(0).Quo(newBig(1), newBig(float64(k)+0.5)))
		sum = sum.plus(even).plus(odd)
	}
	minus := newBig(-2)
	first := z.times(sum).scaled(minus).plus(bigComplex{newBig(0), newBig(0).Mul(root, newBig(2))})
	second := sum.plus(z.times(first)).scaled(minus)
	number := func(c bigComplex) complex128 {
		re, _ := c.re.Float64()
		im, _ := c.im.Float64()
		return complex(re, im)
	}
	return number(sum), number(first), number(second)
}

func TestFaddeeva(t *testing.T) {
	// Row H-w-1p1i of testdata/reference/published.csv: Abramowitz & Stegun, table
	// 7.9, from memory, recomputed and agrees.
	v := newFaddeeva(1, 1)
	if !(math.Abs(real(v.w)-0.304744) < 6e-7) || !(math.Abs(imag(v.w)-0.208219) < 6e-7) {
		t.Errorf("w(1+i) is %v, want 0.304744 + 0.208219 i", v.w)
	}
	near := func(name string, x, y, got, want, tolerance float64) {
		if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
			t.Errorf("%v at %v + %v i is %v, the power series gives %v", name, x, y, got, want)
		}
	}
	for _, x := range []float64{0, 1e-9, 0.3, -0.8, 1.9, -3.1, 4.4, 5.7, 6.8, 6.99, 7.01, -7.5} {
		for _, y := range []float64{0, 1e-12, 1e-6, 1e-3, 0.05, 0.0999, 0.1, 0.3, 1, 2.2, 4} {
			w, d1, d2 := powerSeries(x, y)
			v := newFaddeeva(x, y)
			near("Re w", x, y, real(v.w), real(w), 1e-12)
			if x != 0 {
				near("Im w", x, y, imag(v.w), imag(w), 1e-12)
				// Derivatives of the real part shrink faster than their terms.
				near("Re w'", x, y, real(v.d1), real(d1), 1e-10)
			}
			near("Im w'", x, y, imag(v.d1), imag(d1), 1e-10)
			near("Re w''", x, y, real(v.d2), real(d2), 2e-9)
		}
	}
	// On the imaginary axis w(iy) = exp(y²) erfc(y), DLMF 7.2.3.
	for y := 0.0; y < 26; y += 0.37 {
		near("Re w", 0, y, real(newFaddeeva(0, y).w), math.Exp(y*y)*math.Erfc(y), 1e-15*(10+y*y))
	}
}

// overLorentzian integrates normal fractions over the Lorentzian, whose variable
// is natural·sinh(v)/2: its weight is then dv/(π cosh v), and the trapezoidal rule
// exact to exp(-π²/step). No Faddeeva function is in it.
func overLorentzian(b binning, mean, width, natural float64) []float64 {
	f := make([]float64, b.bins)
	longest := math.Max(1, natural/width)
	for i := range b.bins + 1 {
		longest = math.Max(longest, math.Abs(b.edge(i)-mean)/width)
	}
	step := 0.2 / longest // a fifth of the resolution, where edges pass by
	total := 0.0
	for k := int(-42 / step); float64(k)*step < 42; k++ {
		v := float64(k) * step
		weight := 1 / math.Cosh(v)
		centre := mean + 0.5*natural*math.Sinh(v)
		for i := range f {
			low, high := (b.edge(i)-centre)/width, (b.edge(i+1)-centre)/width
			if low > 9 || high < -9 {
				continue
			}
			if low > 0 {
				low, high = -high, -low
			}
			f[i] += weight * (math.Erfc(-high/math.Sqrt2) - math.Erfc(-low/math.Sqrt2))
		}
	}
	for _, v := range f {
		total += v
	}
	for i := range f {
		f[i] /= total
	}
	return f
}

func TestVoigtFractions(t *testing.T) {
	window := equalBins(100, 160, 20)
	for _, tt := range []struct {
		name                 string
		b                    binning
		mean, width, natural float64
	}{
		{"equal widths", window, 126, 1.6, 1.6},
		{"ten times the resolution", window, 126, 1.6, 16},
		{"a hundred times", window, 126, 1.6, 160},
		{"a hundredth", window, 126, 1.6, 0.016},
		{"a thousandth, wide", window, 126, 8, 0.008},
		{"a millionth: tails are Lorentzian all the same", window, 126, 1.6, 1.6e-6},
		{"narrow against a bin", equalBins(0, 10, 5), 4.3, 0.1, 0.03},
		{"narrow beside an edge", equalBins(0, 10, 5), 4.0001, 0.1, 1e-6},
		{"natural width narrow, far tails", equalBins(-200, 200, 8), 3.3, 1, 1e-6},
		{"below the window", window, 80, 1.6, 0.4},
		{"wider than the window", window, 126, 400, 30},
		{"unequal bins", unequalBins([]float64{100, 110, 124, 125.5, 125.5001, 126.2, 140, 160}), 126, 1.6, 0.5},
		{"one bin", equalBins(100, 160, 1), 126, 1.6, 0.5},
	} {
		t.Run(tt.name, func(t *testing.T) {
			f := make([]float64, tt.b.bins)
			voigtKind.make(tt.b).Fill([]float64{tt.mean, math.Log(tt.width), math.Log(tt.natural)}, f, nil, nil)
			compareFractions(t, f, overLorentzian(tt.b, tt.mean, tt.width, tt.natural))
		})
	}
}

// TestVoigtBeyond: the integral of the profile from x on is an average of erfc/2 over
// the Lorentzian, as in overLorentzian, and keeps its digits for any natural width.
func TestVoigtBeyond(t *testing.T) {
	for _, x := range []float64{0, 0.3, 1, 2.5, 4, 5.5, 6.9, 7.1, 9, 11, 14, 22, 40, 120} {
		for _, y := range []float64{1e-12, 1e-6, 1e-3, 0.05, 0.0999, 0.1001, 0.3, 1, 3, 8, 30} {
			step := 0.3 / math.Max(3, math.Max(x, y))
			want := 0.0
			for k := int(-80 / step); float64(k)*step < 80; k++ {
				v := float64(k) * step
				want += step / (2 * math.Pi) / math.Cosh(v) * math.Erfc(x-y*math.Sinh(v))
			}
			for _, side := range []float64{-x, x} {
				if got := newFaddeeva(side, y).beyond; !(math.Abs(got-want) <= 2e-13*want) {
					t.Errorf("beyond %v, half width %v: %v, the average gives %v", side, y, got, want)
				}
			}
		}
	}
}

// TestVoigtPathsAgree holds the quadrature of narrow bins, near its own limit, to the
// differences over edges.
func TestVoigtPathsAgree(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.Float64Range(-20, 20).Draw(t, "x")
		y := math.Exp(rapid.Float64Range(math.Log(1e-9), math.Log(10)).Draw(t, "log y"))
		width := voigtNarrow * math.Max(1, 0.15*(math.Abs(x)+y))
		low, high := voigtEdge{x: x}, voigtEdge{x: x + width}
		low.at(y)
		high.at(y)
		var over, inside voigtSums
		over.difference(&low, &high)
		inside.integrate(x, high.x-low.x, y, true)
		// Real parts shrink with y where the normal part is over; a difference then has
		// the digits of either edge, and of the powers of z in it.
		p := newFaddeeva(x, y)
		z := 1 + math.Hypot(x, y)
		re, im := real(p.w)*z*z, 1/z
		near := func(name string, got, want, scale float64) {
			if !(math.Abs(got-want) <= 1e-12*scale) {
				t.Fatalf("%v: %v over the edges, %v by quadrature (integral %v)", name, got, want, inside.f)
			}
		}
		if !(math.Abs(over.f-inside.f) <= 1e-10*inside.f) {
			t.Fatalf("%v over the edges, %v by quadrature", over.f, inside.f)
		}
		near("Re w", real(over.w), real(inside.w), re)
		near("Im w", imag(over.w), imag(inside.w), im)
		near("Re zw", real(over.zw), real(inside.zw), re*z)
		near("Re w'", real(over.d), real(inside.d), re*z)
		near("Im w'", imag(over.d), imag(inside.d), im*z)
		near("Re w+zw'", real(over.zd), real(inside.zd), re*z*z)
		near("Im w+zw'", imag(over.zd), imag(inside.zd), im*z*z)
		near("Re zw+z²w'", real(over.zzd), real(inside.zzd), re*z*z*z)
	})
}

// TestVoigtWide: a window of some 1e-7 widths sees a straight line; what bends is of
// the order of 1e-14.
func TestVoigtWide(t *testing.T) {
	b := equalBins(100, 160, 6)
	f := make([]float64, b.bins)
	for _, side := range []float64{-1, 1} {
		const width, natural, away = 7.3e8, 2e8, 5
		voigtKind.make(b).Fill([]float64{130 - side*away*width, math.Log(width), math.Log(natural)}, f, nil, nil)
		w, slope, _ := powerSeries(side*away/math.Sqrt2, natural/width/math.Sqrt(8))
		for i, v := range f {
			centre := (b.edge(i)+b.edge(i+1))/2 - 130
			want := (1 + real(slope)/real(w)*centre/(math.Sqrt2*width)) / 6
			if !(math.Abs(v-want) < 1e-11) {
				t.Errorf("mean on side %v, bin %v: fraction %v, want %v", side, i, v, want)
			}
		}
	}
}

// atCentre is the density at the mean, of a window that holds all but 1e-9.
func atCentre(width, natural float64) float64 {
	const half = 1e-6
	far := 1e9 * (width + natural)
	f := make([]float64, 3)
	b := unequalBins([]float64{-far, -half * width, half * width, far})
	voigtKind.make(b).Fill([]float64{0, math.Log(width), math.Log(natural)}, f, nil, nil)
	return f[1] / (2 * half * width)
}

// TestVoigtCentre: the profile is exp(y²)erfc(y)/(√(2π) width) at its centre, y =
// natural width/(√8 width) (DLMF 7.19.1 and 7.2.3).
func TestVoigtCentre(t *testing.T) {
	for _, natural := range []float64{1e-4, 0.1, 1, 2, 5, 14} {
		const width = 1.7
		y := natural / (math.Sqrt(8) * width)
		want := math.Exp(y*y) * math.Erfc(y) / (math.Sqrt(2*math.Pi) * width)
		if got := atCentre(width, natural); !(math.Abs(got-want) < 2e-9*want) {
			t.Errorf("natural width %v: %v at the centre, want %v", natural, got, want)
		}
	}
	// Row IDN-LS-voigt0 of testdata/reference/published.csv, with the half width 1:
	// DLMF 7.19, from memory, recomputed and agrees.
	if got := atCentre(1, 2); !(math.Abs(got-0.208709) < 6e-7) {
		t.Errorf("%v at the centre, want 0.208709", got)
	}
}

// TestVoigtHalfMaximum: rows LS-voigtFWHM of testdata/reference/published.csv, the
// exact full widths at half maximum as recomputed to six digits and the published
// approximation by Olivero & Longbothum, JQSRT 17 (1977) 233, good to 2e-4 (from memory,
// recomputed and agrees).
func TestVoigtHalfMaximum(t *testing.T) {
	for _, tt := range []struct{ normal, natural, exact, approximate float64 }{
		{1, 1, 1.6376, 1.6376},
		{2, 0.1, 2.05382, 2.054},
		{2, 0.00407, 2.00217, 2.00218},
	} {
		width := tt.normal / math.Sqrt(8*math.Ln2)
		profile := func(x float64) float64 {
			const half = 1e-6
			f := make([]float64, 3)
			voigtKind.make(unequalBins([]float64{-half, half, x - half, x + half})).Fill([]float64{0, math.Log(width), math.Log(tt.natural)}, f, nil, nil)
			return f[2] / f[0]
		}
		low, high := 0.0, 10.0
		for range 50 {
			if middle := (low + high) / 2; middle <= 1e-5 || profile(middle) > 0.5 {
				low = middle
			} else {
				high = middle
			}
		}
		got := 2 * low
		if !(math.Abs(got-tt.exact) < 6e-6) || !(math.Abs(got/tt.approximate-1) < 2e-4) {
			t.Errorf("full width of a normal %v and a Lorentzian %v is %v, want %v", tt.normal, tt.natural, got, tt.exact)
		}
	}
}

func TestVoigtLimits(t *testing.T) {
	b := equalBins(100, 160, 60)
	f, want := make([]float64, b.bins), make([]float64, b.bins)
	voigtKind.make(b).Fill([]float64{126, math.Log(1.6), math.Log(1e-13)}, f, nil, nil)
	gaussianKind.make(b).Fill([]float64{126, math.Log(1.6)}, want, nil, nil)
	for i, v := range f {
		if !(math.Abs(v-want[i]) < 1e-13+1e-10*want[i]) {
			t.Errorf("no natural width, bin %v: %v, the gaussian holds %v", i, v, want[i])
		}
	}
	// Without resolution bins are differences of an arctangent; one of 1e-6 of the
	// natural width changes them by some 1e-12.
	const mean, natural = 126.3, 2.5
	voigtKind.make(b).Fill([]float64{mean, math.Log(1e-6 * natural), math.Log(natural)}, f, nil, nil)
	whole := math.Atan((b.high-mean)/(natural/2)) - math.Atan((b.low-mean)/(natural/2))
	for i := range f {
		// atan b - atan a = atan((b-a)/(1+ab)), without a difference of large angles.
		low, high := (b.edge(i)-mean)/(natural/2), (b.edge(i+1)-mean)/(natural/2)
		want[i] = math.Atan2(high-low, 1+low*high) / whole
	}
	compareFractions(t, f, want)
}

func TestVoigtDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		width := b.binWidth() * math.Exp(rapid.Float64Range(math.Log(0.2), math.Log(1e3)).Draw(t, "log width in bins"))
		natural := width * math.Exp(rapid.Float64Range(math.Log(1e-6), math.Log(30)).Draw(t, "log natural width"))
		mean := b.low + b.window()*rapid.Float64Range(0, 1).Draw(t, "place") + width*rapid.Float64Range(-8, 8).Draw(t, "outside")
		// What a quantity changes by in which the logarithm of the density changes by 1.
		far := math.Max(1, math.Max(b.low-mean, mean-b.high)/width)
		unit := []float64{width / far, 1 / (far * far), 1}
		checkDerivatives(t, voigtKind.make(b), b.bins, []float64{mean, math.Log(width), math.Log(natural)}, unit)
	})
}

// TestVoigtScenario reads one and holds what its natural width is moved by.
func TestVoigtScenario(t *testing.T) {
	const text = `
[luminosity]
unit = "d"
values = [1]
[[channel]]
name = "peak"
window = [100.0, 160.0]
bins = 30
  [[channel.signal]]
  rate = 5.0
  shape = { kind = "voigt", mean = 126.0, width = 2.0, natural_width = 3.0 }
  [[channel.background]]
  name = "flat"
  rate = 80.0
  shape = { kind = "uniform" }
[[uncertainty]]
name = "lifetime"
process = "signal"
moves = "natural_width"
size = 0.1
`
	s, err := read("voigt.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	signal := mustModel(t, s, 1).Channels[0].Processes[0]
	f := make([]float64, 30)
	signal.Shape.Fill(signal.At, f, nil, nil)
	compareFractions(t, f, overLorentzian(equalBins(100, 160, 30), 126, 2, 3))
	if len(signal.Move) != 3 || len(signal.Move[2]) != 1 || signal.Move[2][0].Lin != math.Log1p(0.1) {
		t.Errorf("the signal is moved by %+v, want its natural width by ln 1.1", signal.Move)
	}
}
