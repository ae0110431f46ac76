package physics

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// tailed holds the quantities of a crystal ball as one writes them; 0 for what it lacks.
type tailed struct{ mean, width, alphaLow, nLow, alphaHigh, nHigh float64 }

func (c tailed) shape(b binning) (s crystalBall, q []float64) {
	q = []float64{c.mean, math.Log(c.width)}
	for _, tail := range [][2]float64{{c.alphaLow, c.nLow}, {c.alphaHigh, c.nHigh}} {
		if tail[0] > 0 {
			q = append(q, math.Log(tail[0]), math.Log(tail[1]))
		}
	}
	return newCrystalBall(b, c.alphaLow > 0, c.alphaHigh > 0), q
}

// logarithm is that of the density as it is commonly written, A·(B+|z|)^-n beyond
// alpha with A = (n/α)^n exp(-α²/2) and B = n/α - α.
func (c tailed) logarithm(x float64) float64 {
	z := (x - c.mean) / c.width
	tail := func(alpha, n, distance float64) float64 {
		return n*math.Log(n/alpha) - 0.5*alpha*alpha - n*math.Log(n/alpha-alpha+distance)
	}
	switch {
	case c.alphaLow > 0 && z < -c.alphaLow:
		return tail(c.alphaLow, c.nLow, -z)
	case c.alphaHigh > 0 && z > c.alphaHigh:
		return tail(c.alphaHigh, c.nHigh, z)
	}
	return -0.5 * z * z
}

// quadrature cuts bins at the joints, where the curvature jumps.
func (c tailed) quadrature(b binning) []float64 {
	var edges []float64
	for i := range b.bins + 1 {
		edges = append(edges, b.edge(i))
	}
	for _, joint := range []float64{c.mean - c.alphaLow*c.width, c.mean + c.alphaHigh*c.width} {
		if joint > b.low && joint < b.high {
			edges = append(edges, joint)
		}
	}
	slices.Sort(edges)
	edges = slices.Compact(edges)
	nearest := math.Max(b.low, math.Min(c.mean, b.high))
	pieces := fractionsByQuadrature(unequalBins(edges), c.logarithm, c.logarithm(nearest), c.width/5, b.low, b.high)
	f := make([]float64, b.bins)
	bin := 0
	for k, v := range pieces {
		for edges[k] >= b.edge(bin+1) {
			bin++
		}
		f[bin] += v
	}
	return f
}

func TestCrystalBallFractions(t *testing.T) {
	window := equalBins(100, 160, 60)
	for _, tt := range []struct {
		name string
		b    binning
		c    tailed
	}{
		{"low tail", window, tailed{126, 1.6, 1.5, 3, 0, 0}},
		{"high tail", window, tailed{126, 1.6, 0, 0, 1.2, 5}},
		{"both tails", window, tailed{126, 1.6, 1.5, 3, 2, 20}},
		{"no tail", window, tailed{126, 1.6, 0, 0, 0, 0}},
		{"power next to 1", window, tailed{126, 1.6, 1, 1 + 1e-9, 1.5, 1.0001}},
		{"powers of 1 and below", window, tailed{126, 1.6, 1, 1, 1.5, 0.3}},
		{"power just below 1", window, tailed{126, 1.6, 1, 1 - 1e-9, 1.5, 0.9999}},
		{"powers near 1 and 2", window, tailed{126, 1.6, 1, 1.02, 1.5, 2}},
		{"joint near the mean", window, tailed{126, 1.6, 0.1, 3, 0.15, 2}},
		{"tiny alpha", window, tailed{126, 1.6, 1e-6, 3, 0, 0}},
		{"joints far out", window, tailed{126, 1.6, 10, 2, 9, 4}},
		{"joint beyond the window", equalBins(100, 160, 60), tailed{126, 8, 5, 3, 6, 3}},
		{"window within the low tail", equalBins(10, 40, 30), tailed{126, 1.6, 1.5, 3, 2, 4}},
		{"window within the high tail, far", equalBins(1000, 1040, 30), tailed{126, 1.6, 1.5, 3, 2, 14}},
		{"steep power", window, tailed{126, 1.6, 1, 300, 1.5, 2000}},
		{"nearly exponential", window, tailed{126, 3, 1, 5e4, 1.5, 2e4}},
		{"wide bins", equalBins(-300, 300, 6), tailed{1, 1, 1, 2.5, 2, 6}},
		{"one bin", equalBins(100, 160, 1), tailed{126, 1.6, 1.5, 3, 2, 4}},
		{"joint at an edge", window, tailed{126, 1, 2, 3, 3, 4}},
		{"narrow bins", equalBins(120, 126, 3000), tailed{126, 1.6, 1.5, 3, 0, 0}},
		{"wider than the window", window, tailed{126, 500, 0.01, 3, 0.02, 2}},
		{"a million windows wide, window in the tail", window, tailed{3e8, 6e7, 1.5, 3, 0, 0}},
		{"a million windows wide, window in the core", window, tailed{3e8, 6e7, 0, 0, 1.5, 3}},
		{"a million windows wide, joint in a bin", window, tailed{9e7 + 126.3, 6e7, 1.5, 3, 0, 0}},
		{"unequal bins", unequalBins([]float64{100, 101, 110, 120, 124, 125, 125.0001, 126.2, 128, 160}), tailed{126, 1.6, 0.5, 3, 0.7, 4}},
		{"below the window", window, tailed{80, 4, 1, 3, 1, 2}},
		{"below the window, core alone", window, tailed{80, 4, 1, 3, 0, 0}},
		{"narrow against a bin", equalBins(0, 10, 10), tailed{4.3, 0.02, 1, 3, 1, 30}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			s, q := tt.c.shape(tt.b)
			f := make([]float64, tt.b.bins)
			s.Fill(q, f, nil, nil)
			compareFractions(t, f, tt.c.quadrature(tt.b))
		})
	}
}

// clearOfEdges moves a joint outwards until the steps of checkDerivatives do not
// carry it over an edge: second derivatives jump there.
func clearOfEdges(b binning, mean, alpha, signedWidth float64) float64 {
	for i := 0; i <= b.bins; {
		joint := mean + alpha*signedWidth
		if math.Abs(joint-b.edge(i)) > 0.003*(1+alpha)*math.Abs(signedWidth) {
			i++
			continue
		}
		alpha *= 1.01
		i = 0
	}
	return alpha
}

func TestCrystalBallDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := drawBinning(t)
		c := tailed{width: b.binWidth() * math.Exp(rapid.Float64Range(math.Log(0.2), math.Log(10)).Draw(t, "log width in bins"))}
		c.mean = b.low + b.window()*rapid.Float64Range(0, 1).Draw(t, "place") + c.width*rapid.Float64Range(-8, 8).Draw(t, "outside")
		if rapid.Bool().Draw(t, "narrow") { // all of a tail in a bin or two
			b = equalBins(0, float64(b.bins), b.bins) // where the mean's rounding is small against the width
			c.width = rapid.Float64Range(0.005, 0.2).Draw(t, "width in bins")
			c.mean = float64(b.bins)*rapid.Float64Range(0, 1).Draw(t, "place of a narrow one") + c.width*rapid.Float64Range(-3, 3).Draw(t, "outside by")
		}
		// What a quantity changes by in which the logarithm of the density changes by 1.
		far := math.Max(1, math.Max(b.low-c.mean, c.mean-b.high)/c.width)
		unit := []float64{c.width / far, 1 / (far * far)}
		alpha := rapid.Float64Range(math.Log(0.1), math.Log(10))
		n := rapid.OneOf(rapid.Float64Range(math.Log(0.2), math.Log(200)), rapid.Float64Range(-0.02, 0.02), rapid.Just(0.))
		if rapid.Bool().Draw(t, "low") {
			c.alphaLow = clearOfEdges(b, c.mean, math.Exp(alpha.Draw(t, "log alpha_low")), -c.width)
			c.nLow = math.Exp(n.Draw(t, "log n_low"))
			unit = append(unit, 1/(1+c.alphaLow*c.alphaLow), 1)
		}
		if rapid.Bool().Draw(t, "high") {
			c.alphaHigh = clearOfEdges(b, c.mean, math.Exp(alpha.Draw(t, "log alpha_high")), c.width)
			c.nHigh = math.Exp(n.Draw(t, "log n_high"))
			unit = append(unit, 1/(1+c.alphaHigh*c.alphaHigh), 1)
		}
		s, q := c.shape(b)
		checkDerivatives(t, s, b.bins, q, unit)
	})
}

// TestCrystalBallPathsAgree holds the quadrature of narrow bins, at its own limit,
// to the closed integrals and the differences over edges.
func TestCrystalBallPathsAgree(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		alpha := rapid.Float64Range(math.Log(0.1), math.Log(5))
		n := rapid.Float64Range(math.Log(0.3), math.Log(1e4))
		c := curve{inverse: 0.7, derivatives: true}
		for side := range c.tails {
			c.tails[side] = newPowerTail(alpha.Draw(t, "log alpha"), n.Draw(t, "log n"))
		}
		z1 := rapid.Float64Range(-15, 15).Draw(t, "z")
		if rapid.Bool().Draw(t, "across a joint") {
			z1 = c.tails[1].alpha - finest*rapid.Float64Range(0, 1).Draw(t, "share")
		}
		z2 := z1 + finest
		p1, p2 := c.point(z1), c.point(z2)
		c.closed(z1, z2, finest, &p1, &p2)
		closed := c.cell
		c.cell = cell{}
		c.quadrature(z1, z2, finest)
		// Every derivative is compared with the size that its terms reach.
		z, a := 1+math.Abs(z1), 5.0
		for _, tail := range c.tails {
			a += tail.n + tail.alpha*tail.alpha
		}
		near := func(name string, got, want, scale float64) {
			if !(math.Abs(got-want) <= 1e-9*c.f*scale) {
				t.Fatalf("%v: %v by quadrature, %v over the edges (integral %v)", name, got, want, c.f)
			}
		}
		near("f", c.f, closed.f, 1)
		near("m", c.m, closed.m, z)
		near("u", c.u, closed.u, z*z)
		near("mm", c.mm, closed.mm, z*z)
		near("mu", c.mu, closed.mu, z*z*z)
		near("uu", c.uu, closed.uu, z*z*z*z)
		for side, got := range c.tail {
			want := closed.tail[side]
			near("a", got.a, want.a, a)
			near("n", got.n, want.n, a)
			near("ma", got.ma, want.ma, a*z)
			near("mn", got.mn, want.mn, a*z)
			near("ua", got.ua, want.ua, a*z*z)
			near("un", got.un, want.un, a*z*z)
			near("aa", got.aa, want.aa, a*a)
			near("an", got.an, want.an, a*a)
			near("nn", got.nn, want.nn, a*a)
		}
	})
}

// TestCrystalBallPeak: the density at the mean, normalised over the whole line, is
// 1/(C+D) widths, C = n/α/(n-1) exp(-α²/2), D = √(π/2) (1+erf(α/√2)). Rows
// IDN-LS-CB of testdata/reference/published.csv: Gaiser, SLAC-R-255 (1982), appendix
// F, from memory, recomputed and agrees.
func TestCrystalBallPeak(t *testing.T) {
	for _, tt := range []struct{ alpha, n, want float64 }{
		{1, 2, 0.301023}, {1.5, 3, 0.375401},
	} {
		c := tt.n / tt.alpha / (tt.n - 1) * math.Exp(-tt.alpha*tt.alpha/2)
		d := math.Sqrt(math.Pi/2) * (1 + math.Erf(tt.alpha/math.Sqrt2))
		const half = 1e-6
		for _, mirrored := range []bool{false, true} {
			quantities := tailed{0, 1, tt.alpha, tt.n, 0, 0}
			b := unequalBins([]float64{-1e12, -half, half, 50})
			if mirrored {
				quantities = tailed{0, 1, 0, 0, tt.alpha, tt.n}
				b = unequalBins([]float64{-50, -half, half, 1e12})
			}
			s, q := quantities.shape(b)
			f := make([]float64, 3)
			s.Fill(q, f, nil, nil)
			got := f[1] / (2 * half)
			if !(math.Abs(got-tt.want) < 6e-7) || !(math.Abs(got*(c+d)-1) < 1e-11) {
				t.Errorf("alpha %v, n %v: %v at the mean, want %v", tt.alpha, tt.n, got, tt.want)
			}
		}
	}
}

// TestCrystalBallIsGaussian without tails, and with tails that begin far out.
func TestCrystalBallIsGaussian(t *testing.T) {
	b := equalBins(100, 160, 60)
	const n = 5
	var got, want [3][]float64
	for order, size := range []int{1, 2, 3} {
		got[order], want[order] = make([]float64, size*b.bins), make([]float64, size*b.bins)
	}
	gaussianKind.make(b).Fill([]float64{126, math.Log(1.6)}, want[0], want[1], want[2])
	s, q := tailed{mean: 126, width: 1.6}.shape(b)
	s.Fill(q, got[0], got[1], got[2])
	far := make([]float64, b.bins)
	s, q = tailed{126, 1.6, 9, n, 9, n}.shape(b)
	s.Fill(q, far, nil, nil)
	for order := range got {
		for i, v := range got[order] {
			if !(math.Abs(v-want[order][i]) < 1e-13) {
				t.Errorf("derivative %v, entry %v: %v, the gaussian has %v", order, i, v, want[order][i])
			}
		}
	}
	for i, v := range far {
		if !(math.Abs(v-want[0][i]) < 1e-16+1e-12*want[0][i]) {
			t.Errorf("bin %v: %v with tails far out, the gaussian has %v", i, v, want[0][i])
		}
	}
}

// TestCrystalBallScenario reads one tail of two, moves and frees its quantities.
func TestCrystalBallScenario(t *testing.T) {
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
  shape = { kind = "crystal-ball", mean = 126.0, width = 2.0, alpha_high = 1.5, n_high = 3.0 }
  [[channel.background]]
  name = "broad"
  rate = 80.0
  shape = { kind = "crystal-ball", mean = 126.0, width = 9.0, alpha_low = 1.2, n_low = 1.25, alpha_high = 2, n_high = 5 }
  free = ["n_low"]
[[uncertainty]]
name = "leakage"
process = "signal"
moves = "n_high"
size = 0.25
`
	s, err := read("tails.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	want := []Quantity{{"mean", 126}, {"width", 2}, {"alpha_high", 1.5}, {"n_high", 3}}
	if got := s.Channels[0].Processes[0].Form.Quantities; !slices.Equal(got, want) {
		t.Errorf("the signal has %v, want %v", got, want)
	}
	m := mustModel(t, s, 1)
	signal, broad := m.Channels[0].Processes[0], m.Channels[0].Processes[1]
	f := make([]float64, 30)
	signal.Shape.Fill(signal.At, f, nil, nil)
	compareFractions(t, f, tailed{126, 2, 0, 0, 1.5, 3}.quadrature(equalBins(100, 160, 30)))
	if len(signal.Move) != 4 || len(signal.Move[3]) != 1 || signal.Move[3][0].Lin != math.Log1p(0.25) {
		t.Errorf("the signal is moved by %+v, want its last quantity by ln 1.25", signal.Move)
	}
	if a := s.Yields(1).Parameters[1].Effects[0]; a.Moves != "n_high" || a.Size != "+25 %" {
		t.Errorf("leakage acts as %+v", a)
	}
	free := m.Params[0]
	if free.Name != "peak broad n_low" || free.Nominal != 0 {
		t.Errorf("free power is %+v", free)
	}
	for _, offset := range []float64{free.Lower, free.Upper} {
		q := slices.Clone(broad.At)
		q[3] += offset
		broad.Shape.Fill(q, f, nil, nil)
		if !(f[0] > 0) {
			t.Errorf("the first bin holds %v at the bound %v of the power", f[0], offset)
		}
	}
}
