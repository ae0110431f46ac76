package stats

import "math"

// simulated is one bin's place in the simulation.
type simulated struct {
	tau   float64 // 0 where the bin has no factor
	index int     // in Data.M
}

// simulate gives the bins of the last channel their factors.
func (e *Engine) simulate(c Channel) {
	ch := &e.channels[len(e.channels)-1]
	for bin, tau := range c.Tau {
		if tau == 0 {
			continue
		}
		if ch.simulated == nil {
			ch.simulated = make([]simulated, c.Bins)
		}
		ch.simulated[bin] = simulated{tau, len(e.taus)}
		e.taus = append(e.taus, tau)
	}
}

// factor is the γ that maximises Pois(n|s+γb)·Pois(m|γτ), the larger root of
//
//	b(b+τ)γ² + [(b+τ)s - (n+m)b]γ - ms = 0
//
// taken so that nothing cancels (Conway, arXiv:1103.0354, for a Poisson
// auxiliary count).
func factor(n, m, s, b, tau float64) float64 {
	if n == 0 {
		return m / (b + tau)
	}
	quadratic, linear := b*(b+tau), (b+tau)*s-(n+m)*b
	root := math.Sqrt(linear*linear + 4*quadratic*m*s)
	switch {
	case linear < 0:
		return (root - linear) / (2 * quadratic)
	case m == 0:
		return 0
	case s == 0: // and so b, or linear would be negative
		return m / tau
	}
	return 2 * m * s / (linear + root)
}

// simulatedValue is channelValue with the factors at their best.
func (f *Fitter) simulatedValue(c int, d *Data) float64 {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	n := d.N[ch.first : ch.first+ch.bins]
	sum := 0.0
	for bin, at := range ch.simulated {
		if at.tau == 0 {
			sum += deviance(n[bin], ws.lambda[bin])
			continue
		}
		b := ws.background[bin]
		s := ws.lambda[bin] - b
		m := d.M[at.index]
		g := factor(n[bin], m, s, b, at.tau)
		sum += deviance(n[bin], s+g*b) + deviance(m, g*at.tau)
	}
	return sum
}

// weights are the first and second derivatives of half the deviance of one bin,
// the factor profiled out, in the expected signal and background.
type weights struct {
	signal, background                    []float64 // first derivatives
	signalSignal, signalBackground, backs []float64
}

func newWeights(bins int) *weights {
	memory := make([]float64, 5*bins)
	cut := func(k int) []float64 { return memory[k*bins : (k+1)*bins : (k+1)*bins] }
	return &weights{cut(0), cut(1), cut(2), cut(3), cut(4)}
}

// simulatedWeights sets the weights of a channel and tells whether every count
// is expected. Profiling γ takes (∂²/∂γ∂u)(∂²/∂γ∂v)/(∂²/∂γ²) from ∂²/∂u∂v.
func (f *Fitter) simulatedWeights(c int, d *Data, expected bool) bool {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	w := ws.weights
	n := d.N[ch.first : ch.first+ch.bins]
	for bin, at := range ch.simulated {
		b := ws.background[bin]
		s := ws.lambda[bin] - b
		g, m := 1.0, 0.0
		if at.tau > 0 {
			m = d.M[at.index]
			g = factor(n[bin], m, s, b, at.tau)
		}
		l := s + g*b
		if !(l > 0) && (n[bin] > 0 || l != 0) { // NaN lands here too
			return false
		}
		r, curve, own := 1.0, 0.0, 0.0 // own: ∂²/∂γ² of the auxiliary count
		switch {
		case expected && l > 0:
			r, curve = 1-n[bin]/l, 1/l
		case n[bin] > 0:
			r, curve = 1-n[bin]/l, n[bin]/(l*l)
		}
		mixed := r // ∂²/∂γ∂b without the term of curve
		if expected {
			own, mixed = at.tau/g, 0
		} else if m > 0 {
			own = m / (g * g)
		}
		w.signal[bin], w.background[bin] = r, g*r
		ss, sb, bb := curve, g*curve, g*g*curve
		if at.tau > 0 && g > 0 {
			u, v := b*curve, mixed+g*b*curve
			if total := b*b*curve + own; total > 0 {
				ss -= u * u / total
				sb -= u * v / total
				bb -= v * v / total
			}
		}
		w.signalSignal[bin], w.signalBackground[bin], w.backs[bin] = ss, sb, bb
	}
	return true
}

// simulatedLocals is locals for a channel with simulation factors.
func (f *Fitter) simulatedLocals(c int, d *Data, background, expected bool) bool {
	if !f.simulatedWeights(c, d, expected) {
		return false
	}
	ws := &f.spaces[c]
	w := ws.weights
	columns := f.arrange(c, background)
	k := len(columns)
	for u, column := range columns {
		r, same, other := w.background, w.backs, w.signalBackground
		if ws.ofSignal[u] {
			r, same = w.signal, w.signalSignal
		}
		ws.local[u] = ws.scale[u] * dot(r, column)
		wc, mixed := ws.wc[:len(column)], ws.mixed[:len(column)]
		for bin, v := range column {
			wc[bin] = same[bin] * v
			mixed[bin] = other[bin] * v
		}
		for v := u; v < k; v++ {
			by := wc
			if ws.ofSignal[v] != ws.ofSignal[u] {
				by = mixed
			}
			ws.hessian[u*k+v] = dot(by, columns[v]) * ws.scale[u] * ws.scale[v]
		}
	}
	if !expected {
		f.bendLocals(c, columns, background, w.signal, w.background)
	}
	return true
}
