package physics

import (
	"math"
	"strconv"

	"lumireach/stats"
)

// Yields is what a scenario expects at one luminosity, and what moves it.
type Yields struct {
	Luminosity float64 // in Unit
	Unit       string
	Channels   []ChannelYields
	Parameters []Parameter // in the order of the model's
}

// ChannelYields is the expectation of a channel at nominal parameters and
// signal strength 1, in events.
type ChannelYields struct {
	Name        string
	Unit        string    // of Window and Best, a label
	Window      []float64 // low and high edge, none for a count without a window
	Bins        int
	Signals     []Expected
	Backgrounds []Expected
	// Best is where the signal stands out most; nil without a signal.
	Best *Interval
	// SmallestBackground and SmallestTotal are the smallest expected background,
	// and background with signal, of a bin that holds at least 1/1000 of the
	// channel's fullest signal bin. NaN without a signal.
	SmallestBackground float64
	SmallestTotal      float64
	// Simulation is the statistical error of the background templates; nil
	// without.
	Simulation *Simulation
}

// Simulation describes the factors of a channel that its simulation leaves
// uncertain, one on the whole background of each bin that has one.
type Simulation struct {
	Factors           int
	Smallest, Largest float64 // relative errors 1/√τ
}

// Expected is the expected number of events of one process.
type Expected struct {
	Name   string
	Form   Form
	Events float64
}

// Interval is the run of bins with the largest s/√(s+b).
type Interval struct {
	FirstBin   int // from 0
	Bins       int
	Low, High  float64 // edges, in the channel's Unit; NaN without a window
	Signal     float64 // events
	Background float64 // events
}

// ParameterKind says what is known of a parameter before the data.
type ParameterKind string

const (
	// Free parameters are known from the data alone.
	Free ParameterKind = "free"
	// Tied parameters are free rates that several backgrounds may share.
	Tied ParameterKind = "tied"
	// Constrained parameters have an auxiliary measurement: the uncertainties.
	Constrained ParameterKind = "constrained"
)

// Parameter describes a nuisance parameter in words.
type Parameter struct {
	Name    string
	Kind    ParameterKind
	Shrinks bool    // with luminosity
	Scale   float64 // what that makes of its effects; 1 where it does not shrink
	Effects []Acts
}

// Acts is what one parameter does to one process.
type Acts struct {
	Channel string
	Process string
	Moves   string // "rate", a quantity of the process's form or "template"
	// Size is of one standard deviation at this luminosity, such as "+3 %",
	// "+0.4 GeV" or, where up and down differ, "+4 % / −2 %". Of a template it is
	// the range over its bins, such as "−4 … +9 % / −8 … +5 %". "" for a free
	// parameter.
	Size string
	// Up and Down are what one standard deviation upwards and downwards makes of a
	// rate or a relative quantity, as factors; 0 for anything else.
	Up, Down float64
	// Shift is what one standard deviation upwards adds to an absolute quantity.
	Shift float64
}

// Yields gives the expectation at a luminosity, in the scenario's Unit.
func (s *Scenario) Yields(luminosity float64) Yields {
	y := Yields{Luminosity: luminosity, Unit: s.Unit}
	for i := range s.Channels {
		y.Channels = append(y.Channels, s.Channels[i].yields(luminosity))
	}
	for _, q := range s.parameters() {
		scale := q.scale(luminosity)
		words := Parameter{Name: q.Name, Kind: q.kind, Scale: scale}
		words.Shrinks = q.uncertainty != nil && q.uncertainty.MeasuredAt > 0
		for _, a := range q.actions {
			words.Effects = append(words.Effects, s.acts(q, a, scale))
		}
		y.Parameters = append(y.Parameters, words)
	}
	return y
}

func (s *Scenario) acts(q parameter, a action, scale float64) Acts {
	c := &s.Channels[a.channel]
	p := &c.Processes[a.process]
	words := Acts{Channel: c.Name, Process: p.Name, Moves: "rate"}
	relative, dimension := true, 0
	if a.quantity != actsOnRate {
		switch shape := p.shape.(type) {
		case movingTemplate:
			words.Moves = movesTemplate
			words.Size = shape.sizes(a.quantity, scale)
			return words
		case bernstein:
			words.Moves = coefficientsKey
			return words
		}
	}
	if a.quantity != actsOnRate {
		k := p.Form.kind()
		quantity := k.quantities[a.quantity]
		words.Moves, relative, dimension = quantity.key, quantity.relative, quantity.dimension
	}
	switch {
	case !q.Constrained:
	case relative:
		up, down := a.logarithm(scale), a.logarithm(-scale)
		words.Up, words.Down = math.Exp(up), math.Exp(down)
		words.Size = signed(100*math.Expm1(up)) + " %"
		if a.bend != 0 {
			words.Size += " / " + signed(100*math.Expm1(down)) + " %"
		}
	default:
		words.Shift = scale * a.lin
		words.Size = signed(words.Shift)
		if c.Unit != "" && dimension == 1 {
			words.Size += " " + c.Unit
		}
		if c.Unit != "" && dimension == -1 {
			words.Size += " per " + c.Unit
		}
	}
	return words
}

// logarithm is what the action adds to the logarithm of a rate or a relative
// quantity.
func (a action) logarithm(x float64) float64 {
	g, _, _ := stats.Bend(x)
	return a.lin*x + a.bend*g
}

// sizes is the range over bins of the change of their fractions, at x and -x of
// one quantity.
func (s movingTemplate) sizes(quantity int, x float64) string {
	q := make([]float64, len(s.moves))
	f := make([]float64, len(s.nominal))
	var sides [2]string
	for side, x := range []float64{x, -x} {
		q[quantity] = x
		s.Fill(q, f, nil, nil)
		lowest, highest := math.Inf(1), math.Inf(-1)
		for i, nominal := range s.nominal {
			if nominal > 0 {
				change := math.Round(1e10*(f[i]/nominal-1)) / 1e8 // in per cent, without rounding errors
				lowest, highest = math.Min(lowest, change), math.Max(highest, change)
			}
		}
		sides[side] = signed(lowest) + " … " + signed(highest) + " %"
	}
	return sides[0] + " / " + sides[1]
}

// signed writes a number with its sign, to four digits.
func signed(x float64) string {
	rounded, _ := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 4, 64), 64)
	text := strconv.FormatFloat(math.Abs(rounded), 'g', 6, 64)
	if rounded < 0 {
		return "−" + text
	}
	return "+" + text
}

func (c *Channel) yields(luminosity float64) ChannelYields {
	y := ChannelYields{Name: c.Name, Unit: c.Unit, Window: c.Window, Bins: c.Bins}
	for k := range c.Processes {
		p := &c.Processes[k]
		e := Expected{p.Name, p.Form, luminosity * p.Rate}
		if p.Signal {
			y.Signals = append(y.Signals, e)
		} else {
			y.Backgrounds = append(y.Backgrounds, e)
		}
	}
	y.Simulation = c.describeSimulation()
	signal, background := c.expected()
	for bin := range signal {
		signal[bin] *= luminosity
		background[bin] *= luminosity
	}
	largest := 0.0
	for _, v := range signal {
		largest = max(largest, v)
	}
	if largest == 0 {
		y.SmallestBackground, y.SmallestTotal = math.NaN(), math.NaN()
		return y
	}
	y.SmallestBackground, y.SmallestTotal = math.Inf(1), math.Inf(1)
	for bin, v := range signal {
		if v >= 1e-3*largest {
			y.SmallestBackground = min(y.SmallestBackground, background[bin])
			y.SmallestTotal = min(y.SmallestTotal, background[bin]+v)
		}
	}
	y.Best = c.best(signal, background)
	return y
}

// expected gives the events in each bin per unit luminosity, of all signals at
// strength 1 and of all backgrounds, at nominal parameters.
func (c *Channel) expected() (signal, background []float64) {
	signal, background = make([]float64, c.Bins), make([]float64, c.Bins)
	f := make([]float64, c.Bins)
	for k := range c.Processes {
		p := &c.Processes[k]
		if c.Bins > 1 {
			p.shape.Fill(p.nominal(), f, nil, nil)
		} else {
			f[0] = 1
		}
		bins := background
		if p.Signal {
			bins = signal
		}
		for bin, v := range f {
			bins[bin] += p.Rate * v
		}
	}
	return signal, background
}

// describeSimulation gives nil for a channel without a simulation error.
func (c *Channel) describeSimulation() *Simulation {
	tau, err := c.simulation()
	if err != nil || tau == nil {
		return nil
	}
	out := &Simulation{Smallest: math.Inf(1)}
	for _, size := range tau {
		if size == 0 {
			continue
		}
		out.Factors++
		out.Smallest = math.Min(out.Smallest, 1/math.Sqrt(size))
		out.Largest = math.Max(out.Largest, 1/math.Sqrt(size))
	}
	return out
}

// best tries every run of bins.
func (c *Channel) best(signal, background []float64) *Interval {
	out := &Interval{Low: math.NaN(), High: math.NaN()}
	best := math.Inf(-1)
	for first := range signal {
		var s, b float64
		for bin := first; bin < len(signal); bin++ {
			s += signal[bin]
			b += background[bin]
			if s == 0 {
				continue
			}
			if merit := s / math.Sqrt(s+b); merit > best {
				best = merit
				out.FirstBin, out.Bins = first, bin-first+1
				out.Signal, out.Background = s, b
			}
		}
	}
	if len(c.Window) > 0 {
		edges := c.binning()
		out.Low, out.High = edges.edge(out.FirstBin), edges.edge(out.FirstBin+out.Bins)
	}
	return out
}
