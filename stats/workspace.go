package stats

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
