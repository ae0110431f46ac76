package stats

import "math"

// scan lists starts along one direction in which the likelihood can have
// several maxima.
type scan struct {
	along      []component
	ofSignal   bool // of a signal's shape
	background bool // moves a background too
	// starts are lengths along the direction, rising: from the auxiliary values of
	// constrained parameters, from 0 for a free one.
	starts  []float64
	free    bool
	turning []Effect // rates that two values of the parameter give alike
}

// component is one variable's part of a direction of unit length.
type component struct {
	variable int
	part     float64
}

// farthestStart is how far from the auxiliary values a fit may begin, in
// standard deviations.
const farthestStart = 3

// scans finds the directions that need several starts.
//
// Each quantity of a shape is moved by the constrained parameters along one
// direction. A signal's needs starts if a unit step changes the shape by more than
// 0.4 standard deviations of one event: below that the start from the auxiliary
// values alone finds the maximum that a grid of starts finds. So does a
// background's, unless it is large and alone in its channel, where its own events
// hold it. So does a free parameter of such a background, and a parameter whose
// factors up and down lie on one side of 1, so that it turns.
func scans(m Model, movesBackground []bool) []scan {
	var out []scan
	eachShape(m, func(c *Channel, p *Process, information []float64) {
		if !p.Signal && c.holds(p) {
			return
		}
		for a, move := range p.Move {
			s := scan{ofSignal: p.Signal}
			length := 0.0
			for _, e := range move {
				if m.Params[e.Param].Constrained {
					length = math.Hypot(length, e.Lin)
					s.along = append(s.along, component{1 + e.Param, e.Lin})
				} else if strength := math.Abs(e.Lin) * math.Sqrt(information[a]); strength > 0 {
					out = include(out, scan{along: []component{{1 + e.Param, 1}}, free: true, ofSignal: p.Signal, background: movesBackground[e.Param], starts: freeGrid(&m.Params[e.Param], strength)})
				}
			}
			if length*math.Sqrt(information[a]) < enoughStrength {
				continue
			}
			if p.Signal {
				length = s.leaveBackgrounds(length, movesBackground)
			}
			for i, c := range s.along {
				s.along[i].part /= length
				s.background = s.background || movesBackground[c.variable-1]
			}
			s.starts = grid(length * math.Sqrt(information[a]))
			out = include(out, s)
		}
	})
	for j := range m.Params {
		if effects := turningEffects(m, j); len(effects) > 0 {
			out = append(out, scan{along: []component{{1 + j, 1}}, background: movesBackground[j], turning: effects})
		}
	}
	return out
}

// leaveBackgrounds keeps only what moves signals alone, if that is at least half
// of the direction, and gives the length that remains.
func (s *scan) leaveBackgrounds(length float64, movesBackground []bool) float64 {
	var alone []component
	rest := 0.0
	for _, c := range s.along {
		if !movesBackground[c.variable-1] {
			alone = append(alone, c)
			rest = math.Hypot(rest, c.part)
		}
	}
	if rest < length/2 {
		return length
	}
	s.along = alone
	return rest
}

// include adds a scan, in the place of one along the same direction if its
// starts are more.
func include(scans []scan, s scan) []scan {
	for i, other := range scans {
		cosine := 0.0
		for _, a := range s.along {
			for _, b := range other.along {
				if a.variable == b.variable {
					cosine += a.part * b.part
				}
			}
		}
		if math.Abs(cosine) > 0.95 && s.free == other.free {
			if len(s.starts) > len(other.starts) {
				scans[i] = s
			}
			return scans
		}
	}
	return append(scans, s)
}

const enoughStrength = 0.4

// grid spreads starts at about one shape width about the auxiliary values.
func grid(strength float64) []float64 {
	steps := int(math.Min(8, math.Ceil(farthestStart*strength)))
	var out []float64
	for k := -steps; k <= steps; k++ {
		out = append(out, farthestStart*float64(k)/float64(steps))
	}
	return out
}

// freeGrid spreads starts of a free parameter over some shape widths about
// nominal, and puts one at each bound, where all events of a small background can
// gather in one bin.
func freeGrid(p *Param, strength float64) []float64 {
	const spacing, most = 1.25, 6 // widths, starts on each side
	out := []float64{p.Lower}
	for k := -most; k <= most; k++ {
		if x := p.Nominal + spacing*float64(k)/strength; x > out[len(out)-1] && x < p.Upper {
			out = append(out, x)
		}
	}
	return append(out, p.Upper)
}

// holds tells whether a background is large and most of what its channel has:
// then its events alone say where it stands.
func (c *Channel) holds(p *Process) bool {
	const large = 100 // events
	total := 0.0
	for i := range c.Processes {
		if !c.Processes[i].Signal {
			total += c.Processes[i].Yield
		}
	}
	return p.Yield >= large && p.Yield >= total/2
}

// turningEffects are the rate effects of parameter j that turn.
func turningEffects(m Model, j int) []Effect {
	var out []Effect
	for _, c := range m.Channels {
		for _, p := range c.Processes {
			for _, e := range p.Rate {
				if e.Param == j && p.Yield > 0 && e.Bend != 0 && e.turns() {
					out = append(out, e)
				}
			}
		}
	}
	return out
}

func floating(m Model, movesBackground []bool) []Floating {
	strength := make([]float64, len(m.Params))
	eachShape(m, func(_ *Channel, p *Process, information []float64) {
		if !p.Signal {
			return
		}
		for a, move := range p.Move {
			for _, e := range move {
				// Quantities that one parameter moves are taken as independent.
				strength[e.Param] = math.Max(strength[e.Param], math.Abs(e.Lin)*math.Sqrt(information[a]))
			}
		}
	})
	var out []Floating
	for j, s := range strength {
		if s > 0 && m.Params[j].Constrained && !movesBackground[j] {
			out = append(out, Floating{j, s})
		}
	}
	return out
}

// eachShape calls do with every process that has a shape and a yield, and the
// Fisher information of one event on each quantity, Σ (∂f/∂q)²/f.
func eachShape(m Model, do func(c *Channel, p *Process, information []float64)) {
	for i := range m.Channels {
		c := &m.Channels[i]
		for k := range c.Processes {
			p := &c.Processes[k]
			quantities := len(p.At)
			if p.Shape == nil || p.Yield == 0 || quantities == 0 {
				continue
			}
			f := make([]float64, c.Bins)
			d1 := make([]float64, quantities*c.Bins)
			d2 := make([]float64, quantities*(quantities+1)/2*c.Bins)
			p.Shape.Fill(p.At, f, d1, d2)
			information := make([]float64, quantities)
			for a := range information {
				for bin := range f {
					if d := d1[a*c.Bins+bin]; f[bin] > 0 {
						information[a] += d * d / f[bin]
					}
				}
			}
			do(c, p, information)
		}
	}
}
