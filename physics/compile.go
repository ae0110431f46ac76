package physics

import (
	"fmt"
	"math"

	"lumireach/stats"
)

// Model compiles the scenario at a luminosity, in its Unit. Yields scale with
// luminosity and uncertainties shrink with it where they say so; shapes,
// parameters and the sizes of the simulation do not change. Models share their
// shapes and may be used at the same time.
func (s *Scenario) Model(luminosity float64) (stats.Model, error) {
	if !positive(luminosity) {
		return stats.Model{}, fmt.Errorf("luminosity is %v, must be positive and finite", luminosity)
	}
	m := stats.Model{Channels: make([]stats.Channel, len(s.Channels))}
	for i := range s.Channels {
		c := &s.Channels[i]
		out := stats.Channel{Bins: c.Bins, Processes: make([]stats.Process, len(c.Processes))}
		for k := range c.Processes {
			p := &c.Processes[k]
			yield := luminosity * p.Rate
			if math.IsInf(yield, 1) {
				return stats.Model{}, fmt.Errorf("channel %q, %q: a rate of %v at luminosity %v is too large", c.Name, p.Name, p.Rate, luminosity)
			}
			out.Processes[k] = stats.Process{Yield: yield, Signal: p.Signal, Factor: -1}
			if c.Bins > 1 {
				at := p.nominal()
				out.Processes[k].Shape = p.shape
				out.Processes[k].At = at
				out.Processes[k].Move = make([][]stats.Effect, len(at))
			}
		}
		tau, err := c.simulation()
		if err != nil {
			return stats.Model{}, err
		}
		out.Tau = tau
		m.Channels[i] = out
	}
	for j, q := range s.parameters() {
		m.Params = append(m.Params, q.Param)
		scale := q.scale(luminosity)
		for _, a := range q.actions {
			p := &m.Channels[a.channel].Processes[a.process]
			effect := stats.Effect{Param: j, Lin: scale * a.lin}
			if a.bend != 0 && scale > 0 {
				effect.Bend, effect.Scale = a.bend, scale
			}
			switch {
			case a.quantity == actsOnRate && !q.Constrained:
				p.Factor = j
			case effect.Lin == 0 && effect.Bend == 0: // an uncertainty of size 0 moves nothing
			case a.quantity == actsOnRate:
				p.Rate = append(p.Rate, effect)
			case p.Shape != nil: // one bin holds everything, wherever its peak stands
				p.Move[a.quantity] = append(p.Move[a.quantity], effect)
			}
		}
	}
	return m, nil
}
