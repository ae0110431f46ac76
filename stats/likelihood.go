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

// workspace is what one channel needs while a likelihood is evaluated.
type workspace struct {
	lambda, r, w, wc []float64

	// Only where bins have simulation factors.
	background, mixed []float64 // the part of lambda that factors multiply
	weights           *weights

	// One entry for each local quantity: an amplitude (expected events of a
	// process) or a quantity of its shape.
	columns  [][]float64 // ∂λ/∂local divided by scale
	scale    []float64
	ofSignal []bool
	local    []float64 // gradient
	hessian  []float64 // local × local, upper triangle
	rows     []row     // ∂local/∂variable
	product  []float64 // one row of hessian times the rows, over channel.variables

	processes []processSpace
}

type processSpace struct {
	q, f, d1, d2     []float64
	unit             float64 // yield × exp(rate effects)
	amplitude        float64 // unit × factor × μ
	amplitudeColumn  int
	firstQuantityCol int
}

// row is a sparse row over channel.variables.
type row struct {
	cols []int
	vals []float64
}

func newWorkspace(c *channel) workspace {
	w := workspace{
		lambda:  make([]float64, c.bins),
		r:       make([]float64, c.bins),
		w:       make([]float64, c.bins),
		wc:      make([]float64, c.bins),
		product: make([]float64, len(c.variables)),
	}
	if c.simulated != nil {
		w.background, w.mixed = make([]float64, c.bins), make([]float64, c.bins)
		w.weights = newWeights(c.bins)
	}
	locals := 0
	for i := range c.processes {
		p := &c.processes[i]
		quantities := len(p.at)
		s := processSpace{f: p.fractions}
		if p.fractions == nil {
			s.q = make([]float64, quantities)
			s.f = make([]float64, c.bins)
			s.d1 = make([]float64, quantities*c.bins)
			s.d2 = make([]float64, quantities*(quantities+1)/2*c.bins)
		}
		w.processes = append(w.processes, s)
		amplitude := row{cols: append([]int(nil), p.rateCols...)}
		if p.factorCol >= 0 {
			amplitude.cols = append(amplitude.cols, p.factorCol)
		}
		if p.muCol >= 0 {
			amplitude.cols = append(amplitude.cols, p.muCol)
		}
		amplitude.vals = make([]float64, len(amplitude.cols))
		w.rows = append(w.rows, amplitude)
		locals++
		for _, a := range p.moving {
			r := row{cols: p.movingCols[a]}
			for _, effect := range p.move[a] {
				r.vals = append(r.vals, effect.Lin)
			}
			w.rows = append(w.rows, r)
			locals++
		}
	}
	w.columns = make([][]float64, locals)
	w.scale = make([]float64, locals)
	w.ofSignal = make([]bool, locals)
	w.local = make([]float64, locals)
	w.hessian = make([]float64, locals*locals)
	return w
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

// arrange lists the columns ∂λ/∂local of one channel, to be multiplied by their
// scale, as expectations left them.
func (f *Fitter) arrange(c int, background bool) [][]float64 {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	columns := ws.columns[:0]
	for i := range ch.processes {
		p := &ch.processes[i]
		s := &ws.processes[i]
		if background && p.signal {
			continue
		}
		ws.scale[len(columns)], ws.ofSignal[len(columns)] = 1, p.signal
		s.amplitudeColumn = len(columns)
		columns = append(columns, s.f)
		s.firstQuantityCol = len(columns)
		for _, a := range p.moving {
			ws.scale[len(columns)], ws.ofSignal[len(columns)] = s.amplitude, p.signal
			columns = append(columns, s.d1[a*ch.bins:(a+1)*ch.bins])
		}
	}
	return columns
}

// locals sets the gradient and the Hessian of one channel in its local
// quantities, so that the loops over bins do not grow with the number of
// parameters. It tells whether every count is expected.
func (f *Fitter) locals(c int, d *Data, background, expected bool) bool {
	ch := &f.engine.channels[c]
	if ch.simulated != nil {
		return f.simulatedLocals(c, d, background, expected)
	}
	ws := &f.spaces[c]
	n := d.N[ch.first : ch.first+ch.bins]
	lambda, r, w := ws.lambda[:len(n)], ws.r[:len(n)], ws.w[:len(n)]
	for bin, count := range n {
		l := lambda[bin]
		switch {
		case !(l > 0) && (count > 0 || l != 0): // NaN lands here too
			return false
		case expected && l > 0:
			r[bin] = 1 - count/l
			w[bin] = 1 / l
		case count == 0:
			r[bin] = 1
			w[bin] = 0
		default:
			ratio := count / l
			r[bin] = 1 - ratio
			w[bin] = ratio / l
		}
	}

	columns := f.arrange(c, background)
	k := len(columns)
	for u, column := range columns {
		ws.local[u] = ws.scale[u] * dot(r, column)
		wc := ws.wc[:len(column)]
		for bin, v := range column {
			wc[bin] = w[bin] * v
		}
		h := ws.hessian[u*k:]
		v := u
		for ; v+3 < k; v += 4 {
			h[v], h[v+1], h[v+2], h[v+3] = dot4(wc, columns[v], columns[v+1], columns[v+2], columns[v+3])
		}
		for ; v < k; v++ {
			h[v] = dot(wc, columns[v])
		}
		for v := u; v < k; v++ {
			h[v] *= ws.scale[u] * ws.scale[v]
		}
	}
	if !expected {
		f.bendLocals(c, columns, background, r, r)
	}
	return true
}

// bendLocals adds to the local Hessian what the second derivatives of λ do:
// signalR and backgroundR are the first derivatives of half the deviance in the
// expected events of each bin.
func (f *Fitter) bendLocals(c int, columns [][]float64, background bool, signalR, backgroundR []float64) {
	ch := &f.engine.channels[c]
	ws := &f.spaces[c]
	k := len(columns)
	for i := range ch.processes {
		p := &ch.processes[i]
		s := &ws.processes[i]
		if background && p.signal {
			continue
		}
		r := backgroundR
		if p.signal {
			r = signalR
		}
		for ka, a := range p.moving {
			col := s.firstQuantityCol + ka
			ws.hessian[s.amplitudeColumn*k+col] += dot(r, columns[col])
			for kb := ka; kb < len(p.moving); kb++ {
				pair := pairIndex(len(p.at), a, p.moving[kb])
				ws.hessian[col*k+s.firstQuantityCol+kb] += s.amplitude * dot(r, s.d2[pair*ch.bins:(pair+1)*ch.bins])
			}
		}
	}
}

// pairIndex is the place of the pair a <= b in the order (0,0), (0,1), …, (1,1), ….
func pairIndex(quantities, a, b int) int {
	return a*quantities - a*(a-1)/2 + b - a
}

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

func dot(a, b []float64) float64 {
	b = b[:len(a)]
	var s0, s1, s2, s3 float64
	i := 0
	for ; i+3 < len(a); i += 4 {
		s0 += a[i] * b[i]
		s1 += a[i+1] * b[i+1]
		s2 += a[i+2] * b[i+2]
		s3 += a[i+3] * b[i+3]
	}
	for ; i < len(a); i++ {
		s0 += a[i] * b[i]
	}
	return s0 + s1 + (s2 + s3)
}

// dot4 takes four products in one pass: four independent sums keep the adders
// of a core busy.
func dot4(a, b0, b1, b2, b3 []float64) (s0, s1, s2, s3 float64) {
	b0, b1, b2, b3 = b0[:len(a)], b1[:len(a)], b2[:len(a)], b3[:len(a)]
	for i, v := range a {
		s0 += v * b0[i]
		s1 += v * b1[i]
		s2 += v * b2[i]
		s3 += v * b3[i]
	}
	return
}
