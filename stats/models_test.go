package stats

import (
	"fmt"
	"math"
	"math/rand/v2"
)

// count is one bin of s and b events, b known exactly.
func count(s, b float64) Model {
	return Model{Channels: []Channel{{Bins: 1, Processes: []Process{
		{Yield: s, Signal: true, Factor: -1},
		{Yield: b, Factor: -1},
	}}}}
}

// onOff is a count with a control region of tau times the background.
func onOff(s, b, tau float64) Model {
	m := count(s, b)
	m.Channels[0].Processes[1].Factor = 0
	m.Channels = append(m.Channels, Channel{Bins: 1, Processes: []Process{{Yield: tau * b, Factor: 0}}})
	m.Params = []Param{{Name: "background rate", Nominal: 1, Upper: math.Inf(1), Step: 0.1}}
	return m
}

func uncertainty(name string) Param {
	return Param{Name: name, Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1}
}

// window is a peak over a falling background in 60 bins: free rate and slope;
// efficiency, position and width uncertain.
func window(s, b, shift float64) Model {
	c := centres(100, 160, 60)
	return Model{
		Params: []Param{
			{Name: "rate", Nominal: 1, Upper: math.Inf(1), Step: 0.1},
			{Name: "slope", Lower: -10, Upper: 10, Step: 1. / 60},
			uncertainty("efficiency"), uncertainty("mass scale"), uncertainty("resolution"),
		},
		Channels: []Channel{{Bins: 60, Processes: []Process{
			{
				Yield: s, Signal: true, Factor: -1,
				Rate:  []Effect{{Param: 2, Lin: math.Log(1.1)}},
				Shape: peak{c}, At: []float64{126, math.Log(1.6)},
				Move: [][]Effect{{{Param: 3, Lin: shift}}, {{Param: 4, Lin: math.Log(1.1)}}},
			},
			{Yield: b, Factor: 0, Shape: slope{c}, At: []float64{-0.03}, Move: [][]Effect{{{Param: 1, Lin: 1}}}},
		}}},
	}
}

// several is a random model: windows and counts, shared and private
// uncertainties of rates and shapes, free and tied backgrounds.
func several(r *rand.Rand, channels, uncertainties int) Model {
	var m Model
	for k := range uncertainties {
		m.Params = append(m.Params, uncertainty(fmt.Sprintf("uncertainty %d", k)))
	}
	some := func(most float64) []Effect {
		var e []Effect
		for k := range uncertainties {
			if r.Float64() < 0.3 {
				e = append(e, Effect{Param: k, Lin: (2*r.Float64() - 1) * most})
			}
		}
		return e
	}
	rates := func(most float64) []Effect {
		e := some(most)
		for i := range e {
			if r.Float64() < 0.25 {
				e[i].Bend, e[i].Scale = (2*r.Float64()-1)*most/3, 0.5+r.Float64()
			}
		}
		return e
	}
	tied := -1
	for range channels {
		free := func(p Param) int {
			m.Params = append(m.Params, p)
			return len(m.Params) - 1
		}
		if r.Float64() < 0.4 {
			b := 3 + 50*r.Float64()
			ch := Channel{Bins: 1, Processes: []Process{
				{Yield: 1 + 10*r.Float64(), Signal: true, Factor: -1, Rate: rates(0.2)},
				{Yield: b, Factor: -1, Rate: rates(0.2)},
			}}
			if r.Float64() < 0.5 {
				if tied < 0 {
					tied = free(Param{Name: "tied rate", Nominal: 1, Upper: math.Inf(1), Step: 0.1})
					m.Channels = append(m.Channels, Channel{Bins: 1, Processes: []Process{{Yield: 3 * b, Factor: tied}}})
				}
				ch.Processes[1].Factor = tied
			}
			m.Channels = append(m.Channels, ch)
			continue
		}
		bins := 10 + r.IntN(40)
		c := centres(0, 10, bins)
		position := 2 + 6*r.Float64()
		rate := free(Param{Name: "rate", Nominal: 1, Upper: math.Inf(1), Step: 0.1})
		tilt := free(Param{Name: "slope", Lower: -50, Upper: 50, Step: 0.1})
		m.Channels = append(m.Channels, Channel{Bins: bins, Processes: []Process{
			{
				Yield: 5 + 40*r.Float64(), Signal: true, Factor: -1, Rate: rates(0.2),
				Shape: peak{c}, At: []float64{position, math.Log(0.4 + 0.5*r.Float64())},
				Move: [][]Effect{some(0.1), some(0.15)},
			},
			{
				Yield: 50 + 1000*r.Float64(), Factor: rate, Rate: rates(0.05), Shape: slope{c},
				At: []float64{-0.3 * r.Float64()}, Move: [][]Effect{{{Param: tilt, Lin: 1}}},
			},
			{
				Yield: 20 * r.Float64(), Factor: -1, Rate: rates(0.2), Shape: slope{c},
				At: []float64{0.1}, Move: [][]Effect{nil},
			},
		}})
	}
	return m
}

// simulatedModel gives every bin of every window a simulation factor of 2 % to 50 %.
func simulatedModel(r *rand.Rand, m Model) Model {
	for i := range m.Channels {
		c := &m.Channels[i]
		if c.Bins == 1 {
			continue
		}
		c.Tau = make([]float64, c.Bins)
		for bin := range c.Tau {
			c.Tau[bin] = 4 * math.Pow(625, r.Float64())
		}
	}
	return m
}

// throw draws an experiment by sequential inversion (Devroye, Non-Uniform
// Random Variate Generation, section X.3.3).
func throw(r *rand.Rand, p Point) *Data {
	d := &Data{N: counts(r, p.Lambda), A: make([]float64, len(p.A)), M: counts(r, p.M)}
	for i, a := range p.A {
		d.A[i] = a + r.NormFloat64()
	}
	return d
}

func counts(r *rand.Rand, means []float64) []float64 {
	out := make([]float64, len(means))
	for i, l := range means {
		// Split large means, so that exp(-λ) does not underflow.
		for l > 0 {
			part := math.Min(l, 200)
			l -= part
			u, term, k := r.Float64(), math.Exp(-part), 0.0
			for u > term && term > 0 {
				u -= term
				k++
				term *= part / k
			}
			out[i] += k
		}
	}
	return out
}
