package stats

import "gonum.org/v1/gonum/floats"

// reduce returns an equivalent model with as few constrained parameters as its
// effects can tell apart, and the orthonormal rows basis[k] (over the
// constrained parameters of m, in order) that lead from the old auxiliary
// measurements to the new: a'_k = basis_k · a.
//
// Constrained parameters enter only through sums Lin·θ. Stacked as rows, those
// sums span a space; in an orthonormal basis of it the parameters are unit
// normal again, and every direction outside it keeps its auxiliary value
// whatever the counts are. The reduction is exact. Rows of backgrounds come
// first, so that the later directions move signals alone. A parameter that bends
// anywhere is no such sum and stays itself.
func reduce(m Model) (Model, [][]float64) {
	bent := bentParams(m)
	position := make([]int, len(m.Params)) // among the constrained, -1 for free ones
	constrained := 0
	var kept [][]float64 // rows of basis for the bent
	for j, p := range m.Params {
		position[j] = -1
		if p.Constrained {
			position[j] = constrained
			constrained++
		}
	}
	unit := func(k int) []float64 {
		r := make([]float64, constrained)
		r[k] = 1
		return r
	}
	stays := func(j int) bool { return position[j] < 0 || bent[j] }
	for j := range m.Params {
		if bent[j] {
			kept = append(kept, unit(position[j]))
		}
	}
	row := func(effects []Effect) []float64 {
		r := make([]float64, constrained)
		for _, e := range effects {
			if !stays(e.Param) {
				r[position[e.Param]] += e.Lin
			}
		}
		return r
	}

	var basis [][]float64
	extend := func(effects []Effect) {
		r := row(effects)
		length := floats.Norm(r, 2)
		if length == 0 {
			return
		}
		// Twice is enough: Parlett, The Symmetric Eigenvalue Problem, section 6.9.
		for range 2 {
			for _, b := range basis {
				floats.AddScaled(r, -floats.Dot(b, r), b)
			}
		}
		rest := floats.Norm(r, 2)
		if rest < 1e-10*length {
			return
		}
		floats.Scale(1/rest, r)
		basis = append(basis, r)
	}
	for _, signal := range []bool{false, true} {
		for _, c := range m.Channels {
			for _, p := range c.Processes {
				if p.Signal != signal || p.Yield == 0 {
					continue
				}
				extend(p.Rate)
				for _, move := range p.Move {
					extend(move)
				}
			}
		}
	}

	if len(kept)+len(basis) == constrained {
		identity := make([][]float64, constrained)
		for k := range identity {
			identity[k] = unit(k)
		}
		return m, identity
	}

	out := Model{Channels: make([]Channel, len(m.Channels))}
	newIndex := make([]int, len(m.Params))
	for j, p := range m.Params {
		if stays(j) {
			newIndex[j] = len(out.Params)
			out.Params = append(out.Params, p)
		}
	}
	firstConstrained := len(out.Params)
	for range basis {
		out.Params = append(out.Params, Param{Name: "combined uncertainty", Constrained: true, Lower: negInf, Upper: posInf, Step: 1})
	}
	rotate := func(effects []Effect) []Effect {
		var turned []Effect
		for _, e := range effects {
			if stays(e.Param) {
				e.Param = newIndex[e.Param]
				turned = append(turned, e)
			}
		}
		r := row(effects)
		length := floats.Norm(r, 2)
		for k, b := range basis {
			if lin := floats.Dot(b, r); lin > 1e-14*length || lin < -1e-14*length {
				turned = append(turned, Effect{Param: firstConstrained + k, Lin: lin})
			}
		}
		return turned
	}
	for i, c := range m.Channels {
		out.Channels[i] = Channel{Bins: c.Bins, Processes: make([]Process, len(c.Processes)), Tau: c.Tau}
		for k, p := range c.Processes {
			if p.Yield == 0 {
				p.Rate, p.Move = nil, make([][]Effect, len(p.At))
			}
			p.Rate = rotate(p.Rate)
			move := make([][]Effect, len(p.Move))
			for a, effects := range p.Move {
				move[a] = rotate(effects)
			}
			p.Move = move
			if p.Factor >= 0 {
				p.Factor = newIndex[p.Factor]
			}
			out.Channels[i].Processes[k] = p
		}
	}
	return out, append(kept, basis...)
}

// bentParams tells which constrained parameters have an effect that bends.
func bentParams(m Model) []bool {
	bent := make([]bool, len(m.Params))
	for _, c := range m.Channels {
		for _, p := range c.Processes {
			for _, e := range p.Rate {
				bent[e.Param] = bent[e.Param] || e.Bend != 0 && m.Params[e.Param].Constrained
			}
		}
	}
	return bent
}
