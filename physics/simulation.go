package physics

import (
	"fmt"
	"math"
)

// leastSimulation bounds the size of the simulation behind a bin: below it the
// statistical error is a thousand times the expectation, which then means
// nothing.
const leastSimulation = 1e-6

// simulation is the size of the simulation behind the whole background of each
// bin, (b/e)² with the expectation b and its statistical error e at nominal
// parameters; 0 in bins without an error, nil if that is all of them. Errors are
// those of background templates, independent of one another. It does not depend
// on luminosity: b and e grow alike.
func (c *Channel) simulation() ([]float64, error) {
	var errors []float64
	for k := range c.Processes {
		p := &c.Processes[k]
		if p.Signal || p.Rate == 0 || p.errors == nil {
			continue
		}
		if errors == nil {
			errors = make([]float64, c.Bins)
		}
		for bin, e := range p.errors {
			errors[bin] = math.Hypot(errors[bin], p.Rate*e)
		}
	}
	if errors == nil {
		return nil, nil
	}
	_, background := c.expected()
	var tau []float64
	for bin, e := range errors {
		if e == 0 {
			continue
		}
		ratio := background[bin] / e
		size := ratio * ratio
		switch {
		case !(size >= leastSimulation): // an error that overflows lands here too
			return nil, c.wrongError(bin, background[bin] == 0)
		case math.IsInf(size, 1): // an error too small to matter
			continue
		}
		if tau == nil {
			tau = make([]float64, c.Bins)
		}
		tau[bin] = size
	}
	return tau, nil
}

// wrongError says that a statistical error cannot be that of the expectation.
func (c *Channel) wrongError(bin int, empty bool) error {
	place := fmt.Sprintf("channel %q", c.Name)
	if len(c.Window) > 0 {
		b := c.binning()
		place = fmt.Sprintf("%s from %v to %v", place, b.edge(bin), b.edge(bin+1))
	}
	if empty {
		return fmt.Errorf("%s: templates have a statistical error, but no background is expected: write error 0 there, or add a background", place)
	}
	return fmt.Errorf("%s: the statistical error of the templates is above 1000 times the background: write that of their events", place)
}

// refuseErrors finds statistical errors that the expectation does not allow.
func (c *Channel) refuseErrors(t table) {
	if _, err := c.simulation(); err != nil {
		t.fail(t.path, "%v", err)
	}
}

// HasSimulationError tells whether the background of any bin has a statistical
// error of its simulation, from a template with the column error. Signals have
// none: their column is not looked at.
func (s *Scenario) HasSimulationError() bool {
	for i := range s.Channels {
		if tau, err := s.Channels[i].simulation(); err == nil && tau != nil {
			return true
		}
	}
	return false
}
