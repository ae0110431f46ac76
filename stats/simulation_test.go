package stats

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// byBins is a model of one channel with simulation factors, and the same model
// with every bin as a count of its own, its factor as a free parameter and the
// auxiliary count as a control region.
func byBins(r *rand.Rand, bins int) (profiled, explicit Model) {
	tau := make([]float64, bins)
	processes := make([]Process, 3)
	params := []Param{
		{Name: "rate", Nominal: 1, Upper: math.Inf(1), Step: 0.1},
		uncertainty("signal"), uncertainty("background"),
	}
	rates := [][]Effect{
		{{Param: 1, Lin: 0.1}},
		{{Param: 2, Lin: 0.2, Bend: 0.05, Scale: 1}, {Param: 1, Lin: 0.05}},
		{{Param: 2, Lin: -0.1}},
	}
	explicit.Params = append(explicit.Params, params...)
	fractions := make([][]float64, 3)
	for k := range processes {
		processes[k] = Process{Yield: 10 + 100*r.Float64()*float64(k), Signal: k == 0, Factor: -1, Rate: rates[k]}
		fractions[k] = make([]float64, bins)
		sum := 0.0
		for bin := range bins {
			fractions[k][bin] = r.ExpFloat64()
			sum += fractions[k][bin]
		}
		for bin := range bins {
			fractions[k][bin] /= sum
		}
		processes[k].Shape = fixed{fractions[k]}
	}
	processes[1].Factor = 0
	for bin := range bins {
		g := len(explicit.Params)
		explicit.Params = append(explicit.Params, Param{Name: "γ", Nominal: 1, Upper: math.Inf(1), Step: 0.1})
		var ch Channel
		ch.Bins = 1
		// The engine gives a process one free factor, so the free rate is written
		// as a rate effect of a free logarithm.
		for k, p := range processes {
			p.Shape, p.At, p.Move = nil, nil, nil
			p.Yield *= fractions[k][bin]
			if !p.Signal {
				p.Factor = g
			}
			if k == 1 {
				p.Rate = append([]Effect{{Param: 0, Lin: 1}}, p.Rate...)
			}
			ch.Processes = append(ch.Processes, p)
		}
		// A few bins have no factor.
		tau[bin] = 3 * math.Pow(300, r.Float64())
		if bin%5 == 4 {
			tau[bin] = 0
			explicit.Params[g].Lower, explicit.Params[g].Upper = 1, 1
		}
		explicit.Channels = append(explicit.Channels, ch)
		if tau[bin] > 0 {
			explicit.Channels = append(explicit.Channels, Channel{Bins: 1, Processes: []Process{{Yield: tau[bin], Factor: g}}})
		}
	}
	explicit.Params[0] = Param{Name: "ln rate", Lower: -20, Upper: 20, Step: 0.1}
	return Model{Channels: []Channel{{Bins: bins, Processes: processes, Tau: tau}}, Params: params}, explicit
}

// The factors profiled in closed form are what a fit with all of them as
// parameters finds.
func TestSimulationFactorsInClosedForm(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	for k := range 40 {
		profiled, explicit := byBins(r, 4+k%8)
		e, whole := prepare(t, profiled), prepare(t, explicit)
		f, g := e.Fitter(), whole.Fitter()
		d := throw(r, e.Point(float64(k%3), nil))
		same := &Data{A: d.A}
		m := 0
		for bin, tau := range profiled.Channels[0].Tau {
			same.N = append(same.N, d.N[bin])
			if tau > 0 {
				same.N = append(same.N, d.M[m])
				m++
			}
		}
		free, want := f.Free(d, 1, math.Inf(1)), g.Free(same, 1, math.Inf(1))
		pairs := map[string][2]Fit{"free": {free, want}}
		for _, mu := range []float64{0, 0.5, 3} {
			pairs[fmt.Sprintf("at μ = %v", mu)] = [2]Fit{f.At(d, mu), g.At(same, mu)}
		}
		for name, p := range pairs {
			if p[0].Status != Converged || p[1].Status != Converged {
				t.Errorf("model %d, %s: status %v and %v", k, name, p[0].Status, p[1].Status)
			}
			if math.Abs(p[0].Deviance-p[1].Deviance) > 1e-8*(1+p[1].Deviance) || math.Abs(p[0].Mu-p[1].Mu) > 1e-4*(1+p[1].Mu) {
				t.Errorf("model %d, %s: deviance %v at μ = %v, with explicit factors %v at %v", k, name, p[0].Deviance, p[0].Mu, p[1].Deviance, p[1].Mu)
			}
		}
	}
}

// The root of the quadratic where its terms differ by many orders, against its
// definition n b/(s+γb) + m/γ = b + τ.
func TestSimulationFactor(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 14))
	wide := func() float64 { return math.Pow(10, 12*r.Float64()-6) }
	for range 20000 {
		n, m, s, b, tau := math.Floor(wide()), math.Floor(wide()), wide(), wide(), wide()
		g := factor(n, m, s, b, tau)
		if !(g >= 0) || math.IsInf(g, 1) {
			t.Fatalf("factor(%v, %v, %v, %v, %v) = %v", n, m, s, b, tau, g)
		}
		if m == 0 {
			if slope := b + tau - n*b/(s+g*b); slope < -1e-9*(b+tau) || g > 0 && slope > 1e-9*(b+tau) {
				t.Fatalf("factor(%v, 0, %v, %v, %v) = %v, where the slope is %v", n, s, b, tau, g, slope)
			}
			continue
		}
		if rest := n*b/(s+g*b) + m/g - (b + tau); math.Abs(rest) > 1e-9*(b+tau+m/g) {
			t.Fatalf("factor(%v, %v, %v, %v, %v) = %v leaves %v", n, m, s, b, tau, g, rest)
		}
	}
	for _, c := range [][6]float64{{0, 5, 1, 0, 10, 0.5}, {7, 0, 0, 2, 1, 7. / 3}, {0, 0, 1, 1, 1, 0}, {4, 0, 5, 1, 1, 0}, {3, 6, 1, 0, 2, 3}} {
		if g := factor(c[0], c[1], c[2], c[3], c[4]); math.Abs(g-c[5]) > 1e-14 {
			t.Errorf("factor%v = %v", c[:5], g)
		}
	}
}
