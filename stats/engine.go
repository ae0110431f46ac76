package stats

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

var (
	negInf = math.Inf(-1)
	posInf = math.Inf(1)
)

// Engine is a model made ready for fitting. It is read-only, so all workers
// share one. Its constrained parameters are those of reduce, fewer than the
// model's where effects act together.
type Engine struct {
	channels []channel
	params   []Param
	bins     int
	taus     []float64 // sizes of the simulation, in the order of Data.M
	aux      []int     // parameters with an auxiliary measurement, in the order of Data.A

	// Variables of a fit: 0 is μ, 1+j is parameter j.
	background []int // those that move a background
	all        []int // background's and those that move signals alone, without μ
	floating   []Floating
	scans      []scan

	movesBackground []bool // by parameter
}

// channel is a Channel compiled for the loop over its bins.
type channel struct {
	first, bins int
	fixed       []float64 // expectation of all that no variable changes
	processes   []process
	variables   []int // that change any of its processes
	signalBins  []float64
	bareBins    []float64
	simulated   []simulated // one for each bin, nil where none has a factor
}

// process is a Process whose parameters are variables of a fit; the Cols fields
// hold their positions in channel.variables.
type process struct {
	yield     float64
	signal    bool
	factor    int // variable, -1 for none
	rate      []Effect
	shape     Shape
	fractions []float64 // where no variable moves the shape, else nil
	at        []float64
	move      [][]Effect
	moving    []int // quantities with any effect

	factorCol  int
	muCol      int
	rateCols   []int
	movingCols [][]int
}

// Prepare checks a model and makes it ready for fitting.
func Prepare(m Model) (*Engine, error) {
	if err := check(m); err != nil {
		return nil, err
	}
	m, _ = reduce(m)
	e := &Engine{params: m.Params}
	for j, p := range m.Params {
		if p.Constrained {
			e.aux = append(e.aux, j)
		}
	}
	e.movesBackground = make([]bool, len(m.Params))
	touches := make([]bool, len(m.Params))
	for _, c := range m.Channels {
		e.channels = append(e.channels, compile(c, e.bins))
		e.bins += c.Bins
		e.simulate(c)
		for _, p := range c.Processes {
			if p.Yield == 0 {
				continue
			}
			mark := func(j int) {
				touches[j] = true
				e.movesBackground[j] = e.movesBackground[j] || !p.Signal
			}
			if p.Factor >= 0 {
				mark(p.Factor)
			}
			for _, effect := range p.Rate {
				mark(effect.Param)
			}
			for _, move := range p.Move {
				for _, effect := range move {
					mark(effect.Param)
				}
			}
		}
	}
	for j := range m.Params {
		if touches[j] {
			e.all = append(e.all, 1+j)
		}
		if e.movesBackground[j] {
			e.background = append(e.background, 1+j)
		}
	}
	e.floating = floating(m, e.movesBackground)
	e.scans = scans(m, e.movesBackground)
	return e, nil
}

// Bins is the number of bins of all channels together.
func (e *Engine) Bins() int { return e.bins }

// SmallestControl is the smallest expectation of a channel without signal, +Inf
// where every channel has some.
func (e *Engine) SmallestControl() float64 {
	lambda := e.Point(0, nil).Lambda
	smallest := posInf
	for _, c := range e.channels {
		signal, total := 0.0, 0.0
		for bin, s := range c.signalBins {
			signal += s
			total += lambda[c.first+bin]
		}
		if signal == 0 {
			smallest = math.Min(smallest, total)
		}
	}
	return smallest
}

// Factors is the number of simulation factors.
func (e *Engine) Factors() int { return len(e.taus) }

// Auxiliary is the number of auxiliary measurements of one experiment.
func (e *Engine) Auxiliary() int { return len(e.aux) }

// check refuses what no fit can start from.
func check(m Model) error {
	signal := false
	for i, c := range m.Channels {
		if c.Bins < 1 {
			return fmt.Errorf("channel %d has %d bins", i, c.Bins)
		}
		if c.Tau != nil && len(c.Tau) != c.Bins {
			return fmt.Errorf("channel %d has %d bins and %d sizes of its simulation", i, c.Bins, len(c.Tau))
		}
		for bin, tau := range c.Tau {
			if !(tau >= 0) || math.IsInf(tau, 1) {
				return fmt.Errorf("channel %d, bin %d: size of the simulation is %v, must be finite and >= 0", i, bin, tau)
			}
		}
		for k, p := range c.Processes {
			if !(p.Yield >= 0) || math.IsInf(p.Yield, 1) {
				return fmt.Errorf("channel %d, process %d: yield is %v, must be finite and >= 0", i, k, p.Yield)
			}
			signal = signal || p.Signal && p.Yield > 0
			if p.Shape == nil {
				if c.Bins != 1 {
					return fmt.Errorf("channel %d, process %d: %d bins and no shape", i, k, c.Bins)
				}
				continue
			}
			f := make([]float64, c.Bins)
			p.Shape.Fill(p.At, f, nil, nil)
			for bin, fraction := range f {
				if !(fraction >= 0) || math.IsInf(fraction, 1) {
					return fmt.Errorf("channel %d, process %d: bin %d holds the fraction %v of the events", i, k, bin, fraction)
				}
			}
		}
	}
	if !signal {
		return errors.New("no signal is expected anywhere")
	}
	return nil
}

func compile(c Channel, first int) channel {
	out := channel{
		first: first, bins: c.Bins,
		fixed:      make([]float64, c.Bins),
		signalBins: make([]float64, c.Bins),
		bareBins:   make([]float64, c.Bins),
	}
	seen := map[int]int{}
	column := func(variable int) int {
		k, ok := seen[variable]
		if !ok {
			k = len(out.variables)
			seen[variable] = k
			out.variables = append(out.variables, variable)
		}
		return k
	}
	background := make([]float64, c.Bins)
	for _, p := range c.Processes {
		if p.Yield == 0 {
			continue
		}
		f := []float64{1}
		if p.Shape != nil {
			f = make([]float64, c.Bins)
			p.Shape.Fill(p.At, f, nil, nil)
		}
		for bin := range f {
			if p.Signal {
				out.signalBins[bin] += p.Yield * f[bin]
			} else {
				background[bin] += p.Yield * f[bin]
			}
		}
		q := process{yield: p.Yield, signal: p.Signal, factor: -1, factorCol: -1, muCol: -1, shape: p.Shape, at: p.At}
		if p.Signal {
			q.muCol = column(0)
		}
		if p.Factor >= 0 {
			q.factor = 1 + p.Factor
			q.factorCol = column(q.factor)
		}
		for _, effect := range p.Rate {
			effect.Param++
			q.rate = append(q.rate, effect)
			q.rateCols = append(q.rateCols, column(effect.Param))
		}
		q.move = make([][]Effect, len(p.Move))
		q.movingCols = make([][]int, len(p.Move))
		for a, move := range p.Move {
			for _, effect := range move {
				effect.Param++
				q.move[a] = append(q.move[a], effect)
				q.movingCols[a] = append(q.movingCols[a], column(effect.Param))
			}
			if len(move) > 0 {
				q.moving = append(q.moving, a)
			}
		}
		if len(q.moving) == 0 {
			q.fractions = f
			if !q.signal && q.factor < 0 && len(q.rate) == 0 {
				for bin := range f {
					out.fixed[bin] += q.yield * f[bin]
				}
				continue
			}
		}
		out.processes = append(out.processes, q)
	}
	// Rounding and the far tail of a peak are no place to look for one event.
	const negligible = 1e-6 // of the channel's signal
	total := 0.0
	for _, s := range out.signalBins {
		total += s
	}
	for bin, s := range out.signalBins {
		if background[bin] == 0 && s > negligible*total {
			out.bareBins[bin] = s
		}
	}
	return out
}

// Floating is a constrained parameter of signals alone that moves a shape.
type Floating struct {
	Param int // index among the engine's parameters
	// Strength is how far a unit step changes a signal's shape, in standard
	// deviations of one event: the square root of its Fisher information,
	// Σ (∂f/∂θ)²/f, the largest of all signals.
	Strength float64
}

// Floating lists the parameters of signals alone that move a shape. They exist
// only under the signal hypothesis (Davies, Biometrika 74 (1987) 33).
func (e *Engine) Floating() []Floating { return e.floating }

// Point gives the expectation at signal strength mu and parameters x: of the
// counts and of the auxiliary measurements. A nil x means nominal parameters.
func (e *Engine) Point(mu float64, x []float64) Point {
	v := e.nominal()
	v[0] = mu
	copy(v[1:], x)
	p := Point{Lambda: make([]float64, e.bins), A: make([]float64, len(e.aux)), M: slices.Clone(e.taus)}
	f := e.Fitter()
	for c := range e.channels {
		f.expect(c, v, p.Lambda, mu == 0)
	}
	for k, j := range e.aux {
		p.A[k] = v[1+j]
	}
	return p
}

// Params is the number of nuisance parameters of the engine.
func (e *Engine) Params() int { return len(e.params) }

func (e *Engine) nominal() []float64 {
	v := make([]float64, 1+len(e.params))
	for j, p := range e.params {
		v[1+j] = p.Nominal
	}
	return v
}

// Bare is the expected signal, at μ = 1 and nominal parameters, in bins where
// no background can fall: there one event decides. Bins with less than a
// millionth of their channel's signal are not looked at.
func (e *Engine) Bare() float64 {
	sum := 0.0
	for _, c := range e.channels {
		for _, s := range c.bareBins {
			sum += s
		}
	}
	return sum
}

// SmallestCount is the smallest expectation, at signal strength mu and nominal
// parameters, of a bin that holds at least 1/1000 of the fullest signal bin.
func (e *Engine) SmallestCount(mu float64) float64 {
	largest := 0.0
	for _, c := range e.channels {
		for _, s := range c.signalBins {
			largest = math.Max(largest, s)
		}
	}
	lambda := e.Point(mu, nil).Lambda
	smallest := posInf
	for _, c := range e.channels {
		for bin, s := range c.signalBins {
			if s > 1e-3*largest {
				smallest = math.Min(smallest, lambda[c.first+bin])
			}
		}
	}
	return smallest
}
