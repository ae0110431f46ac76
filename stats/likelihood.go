package stats

import "math"

// deviance is half the deviance of one Poisson count, λ - n + n ln(n/λ), the
// saturated form of Baker & Cousins, Nucl. Instrum. Meth. 221 (1984) 437.
// Near λ = n, where its terms cancel, it is summed as a series: with t = λ/n - 1
// and s = t/(2+t), ln(1+t) = 2 artanh s (DLMF 4.6.5 and 4.37.24).
func deviance(n, lambda float64) float64 {
	if n == 0 {
		return lambda
	}
	if !(lambda > 0) {
		return posInf
	}
	t := (lambda - n) / n
	if t > -0.1 && t < 0.1 {
		s := t / (2 + t)
		u := s * s
		return n * (t*s - 2*s*u*(1./3+u*(1./5+u*(1./7+u*(1./9+u*(1./11+u/13))))))
	}
	return lambda - n - n*math.Log(lambda/n)
}

// expect sets dst to the expectation of channel c at the variables x, and the
// workspace to what its derivatives need. With background set, signals are
// left out.
func (f *Fitter) expect(c int, x []float64, dst []float64, background bool) {
	f.expectations(c, x, background, false)
	copy(dst[f.engine.channels[c].first:], f.spaces[c].lambda)
}

func (f *Fitter) expectations(c int, x []float64, background, derivatives bool) {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	lambda := ws.lambda
	copy(lambda, ch.fixed)
	if ch.simulated != nil {
		copy(ws.background, ch.fixed)
	}
	for i := range ch.processes {
		p := &ch.processes[i]
		if background && p.signal {
			continue
		}
		s := &ws.processes[i]
		exponent := 0.0
		for e := range p.rate {
			effect := &p.rate[e]
			exponent += effect.value(x[effect.Param])
		}
		s.unit = p.yield
		if exponent != 0 {
			s.unit *= math.Exp(exponent)
		}
		s.amplitude = s.unit
		if p.factor >= 0 {
			s.amplitude *= x[p.factor]
		}
		if p.signal {
			s.amplitude *= x[0]
		}
		if p.fractions == nil {
			copy(s.q, p.at)
			for a, move := range p.move {
				for _, effect := range move {
					s.q[a] += effect.Lin * x[effect.Param]
				}
			}
			if derivatives {
				p.shape.Fill(s.q, s.f, s.d1, s.d2)
			} else {
				p.shape.Fill(s.q, s.f, nil, nil)
			}
		}
		amplitude := s.amplitude
		if amplitude == 0 {
			continue
		}
		fractions := s.f[:len(lambda)]
		for bin := range lambda {
			lambda[bin] += amplitude * fractions[bin]
		}
		if ch.simulated != nil && !p.signal {
			for bin := range ws.background {
				ws.background[bin] += amplitude * fractions[bin]
			}
		}
	}
}

// value is half the deviance of d at x: +Inf where a count stands in a bin that
// expects none, or a shape does not exist.
func (f *Fitter) value(x []float64, d *Data, background bool) float64 {
	for c := range f.engine.channels {
		f.expectations(c, x, background, false)
	}
	total := f.valueHere(x, d)
	if math.IsNaN(total) {
		return posInf
	}
	return total
}

func (f *Fitter) constraints(x []float64, d *Data) float64 {
	sum := 0.0
	for k, j := range f.engine.aux {
		pull := x[1+j] - d.A[k]
		sum += pull * pull
	}
	return sum / 2
}

func (f *Fitter) channelValue(c int, d *Data) float64 {
	ch := &f.engine.channels[c]
	if ch.simulated != nil {
		return f.simulatedValue(c, d)
	}
	lambda := f.spaces[c].lambda
	n := d.N[ch.first : ch.first+len(lambda)]
	sum := 0.0
	for bin, l := range lambda {
		sum += deviance(n[bin], l)
	}
	return sum
}

// derivatives sets the gradient and Hessian of value at x over all variables, and
// tells whether it is finite there. With expected set, the Hessian is replaced by
// the expected information (Fisher scoring), which is never negative.
func (f *Fitter) derivatives(x []float64, d *Data, background, expected bool) bool {
	size := len(x)
	clear(f.gradient)
	clear(f.hessian)
	for k, j := range f.engine.aux {
		f.gradient[1+j] = x[1+j] - d.A[k]
		f.hessian[(1+j)*size+1+j] = 1
	}
	for c := range f.engine.channels {
		f.expectations(c, x, background, true)
		if !f.locals(c, d, background, expected) {
			return false
		}
		f.chain(c, x, background, expected)
	}
	return true
}

// valueHere is value at the x of the last call of derivatives or expectations.
func (f *Fitter) valueHere(x []float64, d *Data) float64 {
	total := f.constraints(x, d)
	for c := range f.engine.channels {
		total += f.channelValue(c, d)
	}
	return total
}
