package physics

import (
	"math"
	"strconv"
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
	Effects []Acts
}

// Acts is what one parameter does to one process.
type Acts struct {
	Channel string
	Process string
	Moves   string // "rate" or a quantity of the process's form
	Size    string // of one standard deviation, such as "+3 %" or "+0.4 GeV"; "" for a free parameter
}

// Yields gives the expectation at a luminosity, in the scenario's Unit.
func (s *Scenario) Yields(luminosity float64) Yields {
	y := Yields{Luminosity: luminosity, Unit: s.Unit}
	for i := range s.Channels {
		y.Channels = append(y.Channels, s.Channels[i].yields(luminosity))
	}
	for _, q := range s.parameters() {
		words := Parameter{Name: q.Name, Kind: q.kind}
		for _, a := range q.actions {
			words.Effects = append(words.Effects, s.acts(q, a))
		}
		y.Parameters = append(y.Parameters, words)
	}
	return y
}

func (s *Scenario) acts(q parameter, a action) Acts {
	c := &s.Channels[a.channel]
	p := &c.Processes[a.process]
	words := Acts{Channel: c.Name, Process: p.Name, Moves: "rate"}
	relative, dimension := true, 0
	if a.quantity != actsOnRate {
		k, _ := kindNamed(p.Form.Kind)
		quantity := k.quantities[a.quantity]
		words.Moves, relative, dimension = quantity.key, quantity.relative, quantity.dimension
	}
	switch {
	case !q.Constrained:
	case relative:
		words.Size = signed(100*math.Expm1(a.lin)) + " %"
	default:
		words.Size = signed(a.lin)
		if c.Unit != "" && dimension == 1 {
			words.Size += " " + c.Unit
		}
		if c.Unit != "" && dimension == -1 {
			words.Size += " per " + c.Unit
		}
	}
	return words
}

// signed writes a number with its sign, to six digits.
func signed(x float64) string {
	text := strconv.FormatFloat(x, 'g', 6, 64)
	if x >= 0 {
		return "+" + text
	}
	return text
}

func (c *Channel) yields(luminosity float64) ChannelYields {
	y := ChannelYields{Name: c.Name, Unit: c.Unit, Window: c.Window, Bins: c.Bins}
	signal := make([]float64, c.Bins)
	background := make([]float64, c.Bins)
	f := []float64{1}
	for k := range c.Processes {
		p := &c.Processes[k]
		events := luminosity * p.Rate
		if c.Bins > 1 {
			f = make([]float64, c.Bins)
			p.shape.Fill(p.nominal(), f, nil, nil)
		}
		bins := background
		if p.Signal {
			bins = signal
			y.Signals = append(y.Signals, Expected{p.Name, p.Form, events})
		} else {
			y.Backgrounds = append(y.Backgrounds, Expected{p.Name, p.Form, events})
		}
		for bin, v := range f {
			bins[bin] += events * v
		}
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
