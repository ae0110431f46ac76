package physics

import (
	"math"

	"lumireach/stats"
)

// parameter is a nuisance parameter with everything that it acts on.
type parameter struct {
	stats.Param
	kind        ParameterKind
	uncertainty *Uncertainty // nil for a free one
	actions     []action
}

// action is what one unit of a parameter does: lin is added to a quantity of a
// shape or to the logarithm of a rate, and to the latter what bends as in
// stats.Effect; a free rate is multiplied instead. An uncertainty that shrinks
// does it at Scale times its parameter.
type action struct {
	channel, process int
	quantity         int // of the shape, or actsOnRate
	lin, bend        float64
}

const actsOnRate = -1

// scale is the factor on a parameter at a luminosity.
func (q *parameter) scale(luminosity float64) float64 {
	if q.uncertainty == nil {
		return 1
	}
	return q.uncertainty.Scale(luminosity)
}

// parameters lists free parameters, then uncertainties, in the order of the
// file.
func (s *Scenario) parameters() []parameter {
	var out []parameter
	tied := map[string]int{}
	for i := range s.Channels {
		c := &s.Channels[i]
		for k := range c.Processes {
			p := &c.Processes[k]
			for _, name := range p.Free {
				if name == "rate" && p.Tied != "" {
					j, known := tied[p.Tied]
					if !known {
						j = len(out)
						tied[p.Tied] = j
						out = append(out, freeRate(p.Tied+" rate", Tied))
					}
					out[j].actions = append(out[j].actions, action{channel: i, process: k, quantity: actsOnRate})
					continue
				}
				if name == coefficientsKey {
					out = append(out, p.freeShares(i, k, c.Name+" "+p.Name)...)
					continue
				}
				full := c.Name + " " + p.Name + " " + name
				free := freeRate(full, Free)
				a := action{channel: i, process: k, quantity: actsOnRate}
				if name != "rate" {
					a.quantity = p.quantity(name)
					a.lin = 1
					free.Param = freeQuantity(full, c.binning(), p, a.quantity)
				}
				free.actions = []action{a}
				out = append(out, free)
			}
		}
	}
	for i := range s.Uncertainties {
		u := &s.Uncertainties[i]
		q := parameter{
			Param:       stats.Param{Name: u.Name, Constrained: true, Lower: math.Inf(-1), Upper: math.Inf(1), Step: 1},
			kind:        Constrained,
			uncertainty: u,
		}
		for _, e := range u.Effects {
			q.actions = append(q.actions, s.action(e))
		}
		out = append(out, q)
	}
	return out
}

func freeRate(name string, kind ParameterKind) parameter {
	return parameter{
		Param: stats.Param{Name: name, Nominal: 1, Lower: 0, Upper: math.Inf(1), Step: 0.1},
		kind:  kind,
	}
}

func freeQuantity(name string, b binning, p *Process, quantity int) stats.Param {
	k := p.Form.kind()
	lower, upper, step := k.quantities[quantity].bounds(k.in(b, p.Form), p.Form.Quantities[quantity].Value)
	return stats.Param{Name: name, Lower: lower, Upper: upper, Step: step}
}

// freeShares are the parameters of free coefficients.
func (p *Process) freeShares(channel, process int, name string) []parameter {
	s := p.shape.(bernstein)
	out := make([]parameter, len(s.nominal))
	for a := range out {
		out[a] = parameter{
			Param:   s.parameter(name, a),
			kind:    Free,
			actions: []action{{channel: channel, process: process, quantity: a, lin: 1}},
		}
	}
	return out
}

// quantity is the place of a quantity in the form, actsOnRate for "rate".
func (p *Process) quantity(name string) int {
	if name == "rate" {
		return actsOnRate
	}
	k := p.Form.kind()
	a := k.index(name)
	if a < 0 {
		panic("physics: a quantity that the form lacks")
	}
	return a
}

func (s *Scenario) action(e Effect) action {
	i, known := s.channel(e.Channel)
	if !known {
		panic("physics: an effect on a channel that the scenario lacks")
	}
	k, known := s.Channels[i].process(e.Process)
	if !known {
		panic("physics: an effect on a process that the channel lacks")
	}
	a := action{channel: i, process: k}
	if e.Moves == movesTemplate {
		a.quantity, a.lin = e.quantity, 1
		return a
	}
	a.quantity = s.Channels[i].Processes[k].quantity(e.Moves)
	switch {
	case e.Shift != 0:
		a.lin = e.Shift
	case e.Up == 0:
		a.lin = math.Log1p(e.Size)
	default:
		up, down := math.Log(e.Up), math.Log(e.Down)
		a.lin = (up - down) / 2
		if e.Up*e.Down != 1 {
			a.bend = (up + down) / 2
		}
	}
	return a
}

// checkParameters refuses two parameters of one name, of which results could
// not be told apart.
func (s *Scenario) checkParameters(top table) {
	seen := map[string]bool{}
	parameters := s.parameters()
	free := len(parameters) - len(s.Uncertainties)
	for j, q := range parameters {
		if seen[q.Name] {
			place := join(top.path, "channel")
			if j >= free {
				place = joinIndex(join(top.path, "uncertainty"), j-free)
			}
			top.fail(place, "two parameters would be called %s: rename an uncertainty, a tied label or a process", shown(q.Name))
			return
		}
		seen[q.Name] = true
	}
}
