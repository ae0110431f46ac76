package stats

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
