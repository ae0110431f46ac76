package physics

import (
	"math"
	"slices"
)

func (s *Scenario) readProcess(t table, c Channel, signal bool) (p Process) {
	p.Signal = signal
	switch {
	case t.has("name"):
		p.Name = t.text("name")
	case signal:
		p.Name = "signal"
	default:
		t.missing("name", `name = "…"`)
		return p
	}
	role := "background"
	if signal {
		role = "signal"
	}
	t.name = role + " " + shown(p.Name)
	keys := []string{"name", "rate", "cross_section", "branching", "acceptance", "efficiency", "shape"}
	if !signal {
		keys = append(keys, "free", "tied")
	}
	t.only(keys...)
	p.Rate = readRate(t)
	if t.failed() {
		return p
	}
	if t.has("shape") {
		s.readForm(t.table("shape", "the shape of "+t.name), c, &p)
	} else if c.Bins > 1 {
		t.missing("shape", `shape = { kind = "uniform" }, or another`)
	}
	if !t.failed() {
		readFree(t, c, &p)
	}
	return p
}

func readRate(t table) float64 {
	factors := []string{"branching", "acceptance", "efficiency"}
	if t.has("rate") {
		for _, key := range append([]string{"cross_section"}, factors...) {
			if t.has(key) {
				t.failKey(key, "rate and %s stand together: give either the rate, or cross_section with its factors", key)
				return 0
			}
		}
		return t.notNegative("rate")
	}
	if !t.has("cross_section") {
		t.missing("rate", "rate = events per unit luminosity, or cross_section with branching, acceptance, efficiency")
		return 0
	}
	product := t.notNegative("cross_section")
	for _, key := range factors {
		if !t.has(key) {
			continue
		}
		x := t.number(key)
		if !(x >= 0 && x <= 1) {
			t.failKey(key, "%s is %v, must be a fraction from 0 to 1", key, x)
			return 0
		}
		product *= x
	}
	return product
}

func (t table) notNegative(key string) float64 {
	x := t.number(key)
	if !(x >= 0) {
		t.failKey(key, "%s is %v, must be 0 or above", key, x)
		return 0
	}
	return math.Abs(x) // not -0
}

// readForm reads the shape of a process and prepares it.
func (s *Scenario) readForm(t table, c Channel, p *Process) {
	if t.failed() {
		return
	}
	if !t.has("kind") {
		t.missing("kind", `kind = "uniform", or another of `+listed(kindNames()))
		return
	}
	name := t.text("kind")
	if t.failed() {
		return
	}
	k, known := kindNamed(name)
	if !known {
		t.failKey("kind", "unknown kind of shape %s: %s", shown(name), Suggest(name, kindNames()))
		return
	}
	t.name = "a shape of kind " + shown(name)
	keys := append(append([]string{"kind"}, k.quantityNames()...), k.more...)
	if k.fromFile {
		keys = append(keys, "file")
	}
	t.only(keys...)
	if len(c.Window) == 0 {
		t.fail(t.path, "a shape needs a window: add window = [low, high] to the channel, or drop the shape")
		return
	}
	p.Form.Kind = k.name
	b := c.binning()
	if k.fromFile {
		if !t.has("file") {
			t.missing("file", `file = "name.csv"`)
			return
		}
		p.Form.File = t.text("file")
		if e := t.readTemplate("file", b); e != nil {
			p.shape, p.errors = template{e.fractions}, e.errors
		}
		return
	}
	if k.readMore != nil {
		if k.readMore(t, b, &p.Form); t.failed() {
			return
		}
	}
	at := make([]float64, len(k.quantities))
	for a, q := range k.quantities {
		if !t.has(q.key) {
			if q.partner != "" && !t.has(q.partner) {
				at[a] = math.NaN()
				continue
			}
			if q.partner != "" {
				t.failKey(q.partner, "%s stands without %s: give both, or neither", q.partner, q.key)
				return
			}
			t.missing(q.key, q.key+" = a number")
			return
		}
		at[a] = t.number(q.key)
		if q.relative && !(at[a] > 0) {
			t.failKey(q.key, "%s is %v, must be positive", q.key, at[a])
		}
		if t.failed() {
			return
		}
		p.Form.Quantities = append(p.Form.Quantities, Quantity{q.key, at[a]})
	}
	if k.check != nil {
		if key, what := k.check(k.in(b, p.Form), at); what != "" {
			t.failKey(key, "%s", what)
			return
		}
	}
	if k.makeFrom != nil {
		p.shape = k.makeFrom(b, p.Form)
	} else {
		p.shape = k.make(k.in(b, p.Form))
	}
	f := make([]float64, b.bins)
	p.shape.Fill(p.nominal(), f, nil, nil)
	if slices.ContainsFunc(f, math.IsNaN) {
		t.fail(t.path, "nothing of the %s falls inside the window from %v to %v: bring it nearer", k.name, b.low, b.high)
	}
}

// nominal holds the quantities of a form in the units of its shape.
func (p *Process) nominal() []float64 {
	switch s := p.shape.(type) {
	case movingTemplate:
		return make([]float64, len(s.moves))
	case bernstein:
		return slices.Clone(s.nominal)
	}
	k := p.Form.kind()
	at := make([]float64, len(p.Form.Quantities))
	for a, q := range p.Form.Quantities {
		at[a] = k.quantities[a].local(q.Value)
	}
	return at
}

func readFree(t table, c Channel, p *Process) {
	if t.has("free") {
		k := p.Form.kind()
		allowed := append([]string{"rate"}, k.quantityNames()...)
		if p.Form.Coefficients != nil {
			allowed = append(allowed, coefficientsKey)
		}
		p.Free = t.texts("free", false)
		for i, name := range p.Free {
			path := joinIndex(join(t.path, "free"), i)
			switch {
			case t.failed():
				return
			case !slices.Contains(allowed, name):
				t.fail(path, "%s has no %s to leave free: %s", t.name, shown(name), Suggest(name, allowed))
			case slices.Contains(p.Free[:i], name):
				t.fail(path, "%q is listed twice", name)
			case name != "rate" && c.Bins == 1:
				t.fail(path, "one bin cannot measure the %s: leave it fixed, or take more bins", name)
			case name == coefficientsKey && len(p.Form.Coefficients) == 1:
				t.fail(path, "one coefficient is a uniform density with nothing to leave free: give more, or free the rate alone")
			case name == coefficientsKey && c.Bins < len(p.Form.Coefficients):
				t.fail(path, "%v bins cannot measure %v coefficients: leave them fixed, or take more bins", c.Bins, len(p.Form.Coefficients))
			}
		}
	}
	if !t.has("tied") {
		return
	}
	p.Tied = t.text("tied")
	if !slices.Contains(p.Free, "rate") {
		t.failKey("tied", `tied joins free rates: add free = ["rate"] to %s`, t.name)
	}
}
