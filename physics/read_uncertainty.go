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

var effectKeys = []string{"process", "channels", "moves", "size", "shift", "up", "down"}

func (s *Scenario) readUncertainty(t table) (u Uncertainty) {
	if !t.has("name") {
		t.missing("name", `name = "…"`)
		return u
	}
	u.Name = t.text("name")
	t.name = "uncertainty " + shown(u.Name)
	t.only(append([]string{"name", "effects", "shrinks"}, effectKeys...)...)
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
			if e.has("shrinks") {
				e.failKey("shrinks", "shrinks stands in an effect, must stand beside the name: it is of all effects")
			}
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
	if t.has("shrinks") {
		u.readShrinks(t)
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
	step := t.readStep(moves)
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
			effect := step
			effect.Channel, effect.Process = c.Name, process
			t.checkMove(c, &c.Processes[k], moves)
			if !t.failed() && moves == movesTemplate {
				effect.quantity = t.moveTemplate(c, &c.Processes[k])
			}
			if t.failed() {
				return nil
			}
			out = append(out, effect)
		}
	}
	return out
}

// readStep reads what one standard deviation does.
func (t table) readStep(moves string) Effect {
	e := Effect{Moves: moves}
	pair := t.has("up") || t.has("down")
	for _, key := range []string{"size", "shift"} {
		switch {
		case !t.has(key):
		case moves == movesTemplate:
			t.failKey(key, "a template is moved by up and down, two files, not by %s", key)
		case pair:
			t.failKey(key, "%s stands beside up and down: give either one step or both factors", key)
		}
	}
	for _, keys := range [][2]string{{"up", "down"}, {"down", "up"}} {
		if t.has(keys[0]) && !t.has(keys[1]) {
			t.failKey(keys[0], "%s stands without %s: write both, for +1 and -1 standard deviation", keys[0], keys[1])
		}
	}
	switch {
	case t.failed():
	case moves == movesTemplate && !pair:
		t.fail(t.path, `%s moves a template: write up = "file.csv" and down = "file.csv"`, t.name)
	case moves == movesTemplate:
		e.UpFile, e.DownFile = t.text("up"), t.text("down")
	case pair:
		e.Up, e.Down = t.factor("up"), t.factor("down")
	case t.has("size") && t.has("shift"):
		t.failKey("shift", "size and shift stand together: size is relative (rates, widths), shift absolute (means, slopes)")
	case t.has("size"):
		e.Size = t.number("size")
		if !(e.Size > -1) {
			t.failKey("size", "size is %v, must be above -1: rates and widths stay positive", e.Size)
		}
	case t.has("shift"):
		e.Shift = t.number("shift")
	default:
		t.fail(t.path, "%s has no size, no shift, no up and down: write size = 0.03 for 3 %%, or a shift of a mean or slope", t.name)
	}
	return e
}

// factor reads what a rate is multiplied by.
func (t table) factor(key string) float64 {
	if name, isText := t.values[key].(string); isText {
		t.failKey(key, `%s is the text %s, must be a factor such as 1.04; a file moves a template, with moves = "template"`, key, shown(name))
		return 0
	}
	x := t.number(key)
	if !(x > 0) {
		t.failKey(key, "%s is %v, must be above 0: the factor on the rate, such as 1.04 for 4 %% more", key, x)
	}
	return x
}

// moveTemplate lets an effect move the template of a process, and gives the
// quantity for it.
func (t table) moveTemplate(c *Channel, p *Process) (quantity int) {
	shape := moving(p.shape)
	var sides [2][]float64
	for i, key := range []string{"up", "down"} {
		side := t.readTemplate(key, c.binning())
		if t.failed() {
			return 0
		}
		if err := side.refuseEmpty(shape.nominal); err != nil {
			t.firstErr = err
			return 0
		}
		sides[i] = side.fractions
	}
	quantity = len(shape.moves)
	shape.moves = append(shape.moves, newTemplateMove(shape.nominal, sides[0], sides[1]))
	p.shape = shape
	return quantity
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
	if moves == movesTemplate && p.Form.Kind == templateKind.name {
		return
	}
	if moves == coefficientsKey && p.Form.Coefficients != nil {
		t.failKey("moves", "coefficients cannot be moved by an uncertainty: leave them free, or move the rate")
		return
	}
	relative := true
	if moves != "rate" {
		k := p.Form.kind()
		a := k.index(moves)
		if a < 0 {
			allowed := append([]string{"rate"}, k.quantityNames()...)
			if k.fromFile {
				allowed = append(allowed, movesTemplate)
			}
			t.failKey("moves", "process %q of channel %q has no %s to move: %s", p.Name, c.Name, shown(moves), Suggest(moves, allowed))
			return
		}
		relative = k.quantities[a].relative
	}
	switch {
	case relative && t.has("shift"):
		t.failKey("shift", "the %s is moved by size, which is relative, not by shift", moves)
	case !relative && t.has("size"):
		t.failKey("size", "the %s is moved by shift, in its own unit, not by size", moves)
	case moves != "rate" && t.has("up"):
		step := "shift"
		if relative {
			step = "size"
		}
		t.failKey("up", "the %s is moved by %s, not by up and down, which are for rates and templates", moves, step)
	}
}
