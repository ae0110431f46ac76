package toys

import (
	"context"
	"math"
	"strings"
	"testing"

	"lumireach/stats"
)

// A background known from a control region is known once: the luminosity for 5σ
// is that of a log-normal constraint of the region's own size, but for the
// shapes of the two (1 % here), and less if somebody gives both. By Li & Ma's Eq.
// 17 at the Asimov counts (Astrophys. J. 272 (1983) 317) it is the first.
func TestControlRegionCountsOnce(t *testing.T) {
	const s, b, tau = 3, 10, 1.
	for5 := func(search stats.Search) float64 {
		l, err := search.Luminosity(func(e *stats.Engine) (float64, error) {
			z, err := e.MedianZ(1)
			return z - 5, err
		}, 1, 1000)
		if err != nil {
			t.Fatal(err)
		}
		return l
	}
	control := for5(onOff(s, b, tau))
	non, noff := (s+b)*control, tau*b*control
	z := math.Sqrt(2 * (non*math.Log((1+tau)*non/(non+noff)) + noff*math.Log((1+1/tau)*noff/(non+noff))))
	if math.Abs(z-5) > 1e-6 {
		t.Errorf("Li & Ma give %v at the luminosity for 5σ", z)
	}
	size := 1 / math.Sqrt(tau*b*control)
	lognormal := for5(uncertain(s, b, size))
	if ratio := lognormal / control; math.Abs(ratio-1) > 0.03 {
		t.Errorf("5σ at %v with a log-normal constraint of %v, at %v with the control region of that size", lognormal, size, control)
	}
	both := for5(func(l float64) (stats.Model, error) {
		m, err := onOff(s, b, tau)(l)
		m.Params = append(m.Params, stats.Param{Name: "again", Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1})
		m.Channels[0].Processes[1].Rate = []stats.Effect{{Param: 1, Lin: math.Log1p(size)}}
		// The control region measures the same background.
		m.Channels[1].Processes[0].Rate = m.Channels[0].Processes[1].Rate
		m.Params[0] = stats.Param{Name: "fixed", Nominal: 1, Lower: 1, Upper: 1, Step: 0.1}
		return m, err
	})
	t.Logf("5σ at %.4g by a control region, %.4g by a log-normal of its size, %.4g by both", control, lognormal, both)
	if !(both < 0.85*control) {
		t.Errorf("5σ at %v by both constraints, at %v by one", both, control)
	}
}

// Limits where an uncertain background dominates, against exact sums over counts
// and auxiliary values: their tails lie along the uncertainty, where neither
// background nor signal alone throws toys.
func TestLimitsAlongUncertainty(t *testing.T) {
	const k = 4.5 // quoted errors; right code fails for 1 seed in 150000 per check
	cases := []struct{ s, b, size float64 }{{10, 5, 0.5}, {200, 2000, 0.1}, {400, 4000, 0.1}}
	if testing.Short() {
		cases = cases[:1]
	}
	for _, c := range cases {
		r := testRunner(t, Config{Toys: 5000, Seed: 3})
		e := engine(t, uncertain(c.s, c.b, c.size), 1)
		formula := formulaExclusion(e, 0.95)
		want := exactExclusion(e, 0.95, formula.MuUp).MuUp.list()
		x, err := r.limits(e, 1, formula.MuUp)
		if err != nil {
			t.Fatal(err)
		}
		for i, got := range x.MuUp.list() {
			if se := x.MuUpError.list()[i]; !(math.Abs(got-want[i]) <= k*se) || !(se < 0.08*got) {
				t.Errorf("b = %v ± %v: limit %d is %v ± %v, exactly %v (seed 3)", c.b, c.size, i, got, se, want[i])
			}
		}
	}
}

// A peaking background whose rate, place and width float beside the signal loses
// some centres of its tails: that costs no run.
func TestFreePeakUnderSignal(t *testing.T) {
	search := read(t, `
title = "free peak"
luminosity = { unit = "h", values = [10] }
[[channel]]
name = "m"
window = [0, 10]
bins = 20
  [[channel.signal]]
  rate = 2
  shape = { kind = "gaussian", mean = 5, width = 0.4 }
  [[channel.background]]
  name = "peak"
  rate = 3
  shape = { kind = "gaussian", mean = 5.1, width = 0.9 }
  free = ["rate", "mean", "width"]
`)
	r, err := Reach(context.Background(), search, Config{WithoutExact: true, Luminosities: []float64{10}, Toys: 200, Seed: 1})
	if err != nil {
		t.Fatal(err)
	}
	p := r.Points[0].Toys
	if math.IsNaN(p.Exclusion.MuUp.Median) && p.Exclusion.Why == "" || math.IsNaN(p.Discovery.Z.Median) && p.Discovery.Why == "" {
		t.Errorf("no number and no reason: %+v", p)
	}
}

// A signal with the shape of a background that floats is told of, and a bin that
// the signal hardly reaches does not decide a discovery.
func TestDegenerateModels(t *testing.T) {
	same := read(t, `
title = "same shapes"
luminosity = { unit = "h", values = [10] }
[[channel]]
name = "m"
window = [0, 10]
bins = 5
  [[channel.signal]]
  rate = 2
  shape = { kind = "uniform" }
  [[channel.background]]
  name = "flat"
  rate = 3
  shape = { kind = "uniform" }
  free = ["rate"]
`)
	r, err := Reach(context.Background(), same, Config{WithoutExact: true, Luminosities: []float64{10}})
	if err != nil {
		t.Fatal(err)
	}
	if text := strings.Join(r.Cautions, "\n"); !strings.Contains(text, "cannot tell the signal from a background") {
		t.Errorf("no caution: %s", text)
	}
	empty := func(l float64) (stats.Model, error) {
		return stats.Model{Channels: []stats.Channel{
			{Bins: 1, Processes: []stats.Process{{Yield: 10 * l, Signal: true, Factor: -1}, {Yield: 20 * l, Factor: -1}}},
			{Bins: 2, Processes: []stats.Process{
				{Yield: l, Signal: true, Factor: -1, Shape: twoBins{1 - 1e-9}},
				{Yield: l, Factor: -1, Shape: twoBins{1}},
			}},
		}}, nil
	}
	if e := engine(t, empty, 1); e.Bare() != 0 {
		t.Errorf("one event decides in a bin of %v signal events", e.Bare())
	} else if z, err := e.MedianZ(1); err != nil || !(z > 2) {
		t.Errorf("median Z is %v, %v", z, err)
	} else if _, err := e.Centre(5); err != nil {
		t.Error(err)
	}
}

// twoBins has this part in its first bin.
type twoBins struct{ first float64 }

func (s twoBins) Fill(_, f, _, _ []float64) { f[0], f[1] = s.first, 1-s.first }
