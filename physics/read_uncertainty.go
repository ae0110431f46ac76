package physics

import "slices"

func (s *Scenario) readUncertainties(top table) {
	for _, t := range top.tables("uncertainty", "[[uncertainty]]", "[[uncertainty]]") {
		u := s.readUncertainty(t)
		if t.failed() {
			return
		}
		if slices.ContainsFunc(s.Uncertainties, func(v Uncertainty) bool { return v.Name == u.Name }) {
			t.failKey("name", "uncertainty %q is there twice: give each its own name", u.Name)
			return
		}
		s.Uncertainties = append(s.Uncertainties, u)
	}
}

var effectKeys = []string{"process", "channels", "moves", "size", "shift"}

func (s *Scenario) readUncertainty(t table) (u Uncertainty) {
	if !t.has("name") {
		t.missing("name", `name = "…"`)
		return u
	}
	u.Name = t.text("name")
	t.name = "uncertainty " + shown(u.Name)
	t.only(append([]string{"name", "effects"}, effectKeys...)...)
	effects := []table{t}
	if t.has("effects") {
		for _, key := range effectKeys {
			if t.has(key) {
				t.failKey(key, "%s and effects stand together: write one effect in place, or all of them in effects", key)
				return u
			}
		}
		effects = t.tables("effects", "an effect of "+t.name, "{ process = …, size = … }")
		if len(effects) == 0 {
			t.failKey("effects", "effects is an empty list: write at least one")
			return u
		}
		for _, e := range effects {
			e.only(effectKeys...)
		}
	}
	for _, e := range effects {
		for _, effect := range s.readEffect(e) {
			twice := slices.ContainsFunc(u.Effects, func(o Effect) bool {
				return o.Channel == effect.Channel && o.Process == effect.Process && o.Moves == effect.Moves
			})
			if twice {
				e.fail(e.path, "%s acts twice on the %s of %q in channel %q: once is allowed", t.name, effect.Moves, effect.Process, effect.Channel)
				return u
			}
			u.Effects = append(u.Effects, effect)
		}
	}
	return u
}

// readEffect reads one effect, on each process that it acts on.
func (s *Scenario) readEffect(t table) []Effect {
	if t.failed() {
		return nil
	}
	if !t.has("process") {
		t.missing("process", `process = "signal", or another name or list of names`)
		return nil
	}
	processes := t.texts("process", true)
	moves := "rate"
	if t.has("moves") {
		moves = t.text("moves")
	}
	size, shift := t.readStep()
	if t.failed() {
		return nil
	}
	var out []Effect
	for i, process := range processes {
		place := join(t.path, "process")
		if len(processes) > 1 {
			place = joinIndex(place, i)
		}
		for _, channel := range s.channelsOf(t, process, place) {
			c := &s.Channels[channel]
			k, known := c.process(process)
			if !known {
				t.fail(place, "channel %q has no process %s: %s", c.Name, shown(process), Suggest(process, c.processNames()))
				return nil
			}
			t.checkMove(c, &c.Processes[k], moves)
			if t.failed() {
				return nil
			}
			out = append(out, Effect{Channel: c.Name, Process: process, Moves: moves, Size: size, Shift: shift})
		}
	}
	return out
}

func (t table) readStep() (size, shift float64) {
	switch {
	case t.has("size") && t.has("shift"):
		t.failKey("shift", "size and shift stand together: size is relative (rates, widths), shift absolute (means, slopes)")
	case t.has("size"):
		size = t.number("size")
		if !(size > -1) {
			t.failKey("size", "size is %v, must be above -1: rates and widths stay positive", size)
		}
	case t.has("shift"):
		shift = t.number("shift")
	default:
		t.fail(t.path, "%s has neither size nor shift: write size = 0.03 for 3 %%, or a shift of a mean or slope", t.name)
	}
	return size, shift
}

// channelsOf lists the channels that an effect names or, where it names none,
// those that have the process.
func (s *Scenario) channelsOf(t table, process, place string) []int {
	var out []int
	if t.has("channels") {
		for i, name := range t.texts("channels", false) {
			c, known := s.channel(name)
			if t.failed() {
				return nil
			}
			if !known {
				t.fail(joinIndex(join(t.path, "channels"), i), "there is no channel %s: %s", shown(name), Suggest(name, s.channelNames()))
				return nil
			}
			out = append(out, c)
		}
		return out
	}
	var all []string
	for i := range s.Channels {
		c := &s.Channels[i]
		if _, known := c.process(process); known {
			out = append(out, i)
		}
		for _, name := range c.processNames() {
			if !slices.Contains(all, name) {
				all = append(all, name)
			}
		}
	}
	if len(out) == 0 {
		t.fail(place, "no channel has a process %s: %s", shown(process), Suggest(process, all))
	}
	return out
}

// checkMove refuses an effect on what the process does not have, or by a step
// of the wrong kind.
func (t table) checkMove(c *Channel, p *Process, moves string) {
	relative := true
	if moves != "rate" {
		k, _ := kindNamed(p.Form.Kind)
		a := k.index(moves)
		if a < 0 {
			t.failKey("moves", "process %q of channel %q has no %s to move: %s",
				p.Name, c.Name, shown(moves), Suggest(moves, append([]string{"rate"}, k.quantityNames()...)))
			return
		}
		relative = k.quantities[a].relative
	}
	switch {
	case relative && t.has("shift"):
		t.failKey("shift", "a %s is moved by size, which is relative, not by shift", moves)
	case !relative && t.has("size"):
		t.failKey("size", "a %s is moved by shift, in its own unit, not by size", moves)
	}
}
