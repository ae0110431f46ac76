package toys

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"lumireach/stats"
)

// parameters say where the nuisance parameters of a proposal are drawn from, and
// what is expected with them.
type parameters struct {
	mu    float64
	theta []float64 // means of the constrained parameters, of unit standard deviation
	gamma []float64 // modes of the simulation factors
	tilt  []float64 // by bin: factor on the expectation; nil for 1

	logTilt, logGamma []float64
}

// at is a proposal at nominal parameters, or where they are drawn from what is
// known of them.
func (r *runner) at(e *stats.Engine, mu float64, toys int) proposal {
	p := proposal{Point: e.Point(mu, nil), near: mu, toys: toys}
	if r.config.Nuisances == Drawn {
		p.drawn = nominal(e)
		p.drawn.mu = mu
	}
	return p
}

func nominal(e *stats.Engine) *parameters {
	p := &parameters{theta: make([]float64, e.Auxiliary()), gamma: make([]float64, e.Factors())}
	for i := range p.gamma {
		p.gamma[i] = 1
	}
	return p
}

// drawnToy is the parameters of one toy and what is expected with them.
type drawnToy struct {
	split                 *stats.Fitter
	taus, theta, gamma    []float64
	signal, background    []float64
	expected, logExpected []float64
	exists                bool // whether every shape does
}

func newDrawnToy(e *stats.Engine) *drawnToy {
	bins := func() []float64 { return make([]float64, e.Bins()) }
	return &drawnToy{
		split: e.Fitter(), taus: e.Taus(),
		theta: make([]float64, e.Auxiliary()), gamma: make([]float64, e.Factors()),
		signal: bins(), background: bins(), expected: bins(), logExpected: bins(),
	}
}

// throwDrawn draws a toy's parameters, then its counts. What is known of a
// simulation factor after τ events is Gamma(τ+1, 1/τ). It is false where a shape
// does not exist with these parameters: there is no data then, and no fit.
func (m *mixture) throwDrawn(w *worker, k int) bool {
	p, t := m.proposals[k].drawn, w.drawn
	for j, mean := range p.theta {
		t.theta[j] = mean + w.stream.NormFloat64()
	}
	for i, mode := range p.gamma {
		t.gamma[i] = distuv.Gamma{Alpha: t.taus[i] + 1, Beta: t.taus[i] / mode, Src: w.stream.source}.Rand()
	}
	t.split.Split(t.theta, t.gamma, t.signal, t.background)
	t.exists = true
	for bin, b := range t.background {
		mean := p.mu*t.signal[bin] + b
		if p.tilt != nil {
			mean *= p.tilt[bin]
		}
		t.expected[bin] = mean
		t.exists = t.exists && mean >= 0 && !math.IsInf(mean, 1)
	}
	if !t.exists {
		return false
	}
	for bin, mean := range t.expected {
		count := newPoisson(mean, 1)
		w.data.N[bin] = count.draw(w.stream)
	}
	clear(w.data.A)
	copy(w.data.M, t.taus)
	return true
}

func (m *mixture) prepareDrawn() {
	for k := range m.proposals {
		p := m.proposals[k].drawn
		for _, tilt := range p.tilt {
			p.logTilt = append(p.logTilt, math.Log(tilt))
		}
		for _, mode := range p.gamma {
			p.logGamma = append(p.logGamma, math.Log(mode))
		}
	}
}

// logDrawn is logDensities over parameters and counts, or over parameters alone
// where these give no counts.
func (m *mixture) logDrawn(w *worker) {
	t := w.drawn
	last := math.NaN()
	for k := range m.proposals {
		p := m.proposals[k].drawn
		sum := 0.0
		for j, mean := range p.theta {
			z := t.theta[j] - mean
			sum -= z * z / 2
		}
		for i, mode := range p.gamma {
			sum -= (t.taus[i]+1)*p.logGamma[i] + t.taus[i]*t.gamma[i]/mode
		}
		if !t.exists {
			w.logs[k] = sum
			continue
		}
		if p.mu != last {
			last = p.mu
			for bin, b := range t.background {
				t.expected[bin] = p.mu*t.signal[bin] + b
				if w.data.N[bin] > 0 {
					t.logExpected[bin] = math.Log(t.expected[bin])
				}
			}
		}
		for bin, n := range w.data.N {
			mean := t.expected[bin]
			if p.tilt != nil {
				mean *= p.tilt[bin]
			}
			sum -= mean
			if n > 0 {
				sum += n * t.logExpected[bin]
				if p.tilt != nil {
					sum += n * p.logTilt[bin]
				}
			}
		}
		w.logs[k] = sum
	}
}
