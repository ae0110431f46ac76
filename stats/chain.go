package stats

// jacobianRows gives ∂local/∂variable of one channel, over its variables.
func (f *Fitter) jacobianRows(c int, x []float64, background bool) []*row {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	rows := f.rows[:0]
	r := 0
	for i := range ch.processes {
		p := &ch.processes[i]
		s := &ws.processes[i]
		if background && p.signal {
			r += 1 + len(p.moving)
			continue
		}
		amplitude := &ws.rows[r]
		for e := range p.rate {
			amplitude.vals[e] = s.amplitude * p.rate[e].slope(x[p.rate[e].Param])
		}
		e := len(p.rate)
		mu, factor := p.factors(x)
		if p.factor >= 0 {
			amplitude.vals[e] = s.unit * mu
			e++
		}
		if p.signal {
			amplitude.vals[e] = s.unit * factor
		}
		for range 1 + len(p.moving) {
			rows = append(rows, &ws.rows[r])
			r++
		}
	}
	f.rows = rows
	return rows
}

// factors are what multiplies a process besides its own rate: μ, or 1 for a
// background, and the free rate, or 1.
func (p *process) factors(x []float64) (mu, factor float64) {
	mu, factor = 1, 1
	if p.signal {
		mu = x[0]
	}
	if p.factor >= 0 {
		factor = x[p.factor]
	}
	return mu, factor
}

// chain adds one channel's derivatives to those in the variables of the fit.
func (f *Fitter) chain(c int, x []float64, background, expected bool) {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	size := len(x)
	rows := f.jacobianRows(c, x, background)
	k := len(rows)
	for i := range ch.processes {
		p := &ch.processes[i]
		if expected || background && p.signal {
			continue
		}
		s := &ws.processes[i]
		mu, factor := p.factors(x)
		f.curvature(p, ws.local[s.amplitudeColumn], s, x, mu, factor)
	}
	for u := range k {
		ru := rows[u]
		for e, col := range ru.cols {
			f.gradient[ch.variables[col]] += ws.local[u] * ru.vals[e]
		}
		product := ws.product
		clear(product)
		for v := range k {
			h := ws.hessian[u*k+v]
			if v < u {
				h = ws.hessian[v*k+u]
			}
			rv := rows[v]
			for e, col := range rv.cols {
				product[col] += h * rv.vals[e]
			}
		}
		for e, col := range ru.cols {
			value := ru.vals[e]
			if value == 0 {
				continue
			}
			target := f.hessian[ch.variables[col]*size:]
			for other, variable := range ch.variables {
				target[variable] += value * product[other]
			}
		}
	}
}

// curvature adds the second derivatives of an amplitude in the variables, times
// the gradient in that amplitude.
func (f *Fitter) curvature(p *process, gradient float64, s *processSpace, x []float64, mu, factor float64) {
	size := len(x)
	add := func(i, j int, value float64) {
		f.hessian[i*size+j] += value
		if i != j {
			f.hessian[j*size+i] += value
		}
	}
	for i := range p.rate {
		a := &p.rate[i]
		slope := a.slope(x[a.Param])
		if a.Bend != 0 {
			add(a.Param, a.Param, gradient*s.amplitude*a.curvature(x[a.Param]))
		}
		for k := range p.rate[i:] {
			b := &p.rate[i+k]
			add(a.Param, b.Param, gradient*s.amplitude*slope*b.slope(x[b.Param]))
		}
		if p.factor >= 0 {
			add(p.factor, a.Param, gradient*s.unit*mu*slope)
		}
		if p.signal {
			add(0, a.Param, gradient*s.unit*factor*slope)
		}
	}
	if p.signal && p.factor >= 0 {
		add(0, p.factor, gradient*s.unit)
	}
}
