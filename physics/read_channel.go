package physics

import (
	"math"
	"slices"
)

const (
	mostBins    = 10000  // of a channel
	mostAllBins = 100000 // of all channels together
)

func (s *Scenario) readChannels(top table) {
	channels := top.tables("channel", "[[channel]]", "[[channel]]")
	if len(channels) == 0 {
		top.missing("channel", "[[channel]] with a name, bins and at least one [[channel.signal]]")
		return
	}
	bins, signal := 0, false
	for _, t := range channels {
		c := s.readChannel(t)
		if t.failed() {
			return
		}
		if _, known := s.channel(c.Name); known {
			t.failKey("name", "channel %q is there twice: give every channel its own name", c.Name)
			return
		}
		bins += c.Bins
		if bins > mostAllBins {
			t.failKey("bins", "there are more than %v bins in all channels together", mostAllBins)
			return
		}
		s.Channels = append(s.Channels, c)
		for _, p := range c.Processes {
			signal = signal || p.Signal && p.Rate > 0
		}
	}
	if !signal {
		channels[0].fail(channels[0].path, "no channel has a signal with a rate above 0: add [[channel.signal]] with a rate")
	}
}

func (s *Scenario) channel(name string) (int, bool) {
	i := slices.IndexFunc(s.Channels, func(c Channel) bool { return c.Name == name })
	return i, i >= 0
}

func (c *Channel) process(name string) (int, bool) {
	i := slices.IndexFunc(c.Processes, func(p Process) bool { return p.Name == name })
	return i, i >= 0
}

func (s *Scenario) channelNames() []string {
	names := make([]string, len(s.Channels))
	for i, c := range s.Channels {
		names[i] = c.Name
	}
	return names
}

func (c *Channel) processNames() []string {
	names := make([]string, len(c.Processes))
	for i, p := range c.Processes {
		names[i] = p.Name
	}
	return names
}

func (c *Channel) binning() binning {
	switch {
	case len(c.Edges) > 0:
		return unequalBins(c.Edges)
	case len(c.Window) == 0:
		return binning{bins: c.Bins}
	}
	return equalBins(c.Window[0], c.Window[1], c.Bins)
}

func (s *Scenario) readChannel(t table) (c Channel) {
	if !t.has("name") {
		t.missing("name", `name = "…"`)
		return c
	}
	c.Name = t.text("name")
	t.name = "channel " + shown(c.Name)
	t.only("name", "unit", "window", "bins", "edges", "signal", "background")
	if t.has("unit") {
		c.Unit = t.text("unit")
	}
	c.readBins(t)
	if t.failed() {
		return c
	}
	signals := t.tables("signal", "a signal of "+t.name, "[[channel.signal]]")
	backgrounds := t.tables("background", "a background of "+t.name, "[[channel.background]]")
	if len(signals)+len(backgrounds) == 0 {
		t.fail(t.path, "%s has no process: add [[channel.signal]] or [[channel.background]]", t.name)
	}
	places := make([]table, 0, len(signals)+len(backgrounds))
	for i, p := range append(slices.Clone(signals), backgrounds...) {
		process := s.readProcess(p, c, i < len(signals))
		if t.failed() {
			return c
		}
		if _, known := c.process(process.Name); known {
			p.failKey("name", "process %q is there twice in %s: give each its own name", process.Name, t.name)
			return c
		}
		c.Processes = append(c.Processes, process)
		places = append(places, p)
	}
	if !t.failed() {
		c.refuseUnderflow(places)
	}
	if !t.failed() {
		c.refuseErrors(t)
	}
	return c
}

// readBins reads the window and its bins, equal or by their edges.
func (c *Channel) readBins(t table) {
	if t.has("edges") {
		for _, key := range []string{"window", "bins"} {
			if t.has(key) {
				t.failKey(key, "edges and %s stand together: edges say both where the window is and what its bins are", key)
				return
			}
		}
		c.readEdges(t)
		return
	}
	if !t.has("bins") {
		t.missing("bins", "bins = 60, or edges = [low, …, high], or bins = 1 for a count")
		return
	}
	c.Bins = t.whole("bins", 1, mostBins)
	switch {
	case t.failed():
	case t.has("window"):
		c.Window = readWindow(t, c.Bins)
	case c.Bins > 1:
		t.missing("window", "window = [low, high], or bins = 1 for a count")
	}
}

// readEdges reads bins of any widths.
func (c *Channel) readEdges(t table) {
	edges := t.numbers("edges", "a list of rising numbers")
	if t.failed() {
		return
	}
	last := len(edges) - 1
	if last < 1 || last > mostBins {
		t.failKey("edges", "edges is a list of %v, must be of 2 to %v rising numbers", len(edges), mostBins+1)
		return
	}
	const resolution = 1e-12
	farthest := math.Max(math.Abs(edges[0]), math.Abs(edges[last]))
	for i := range last {
		if !(edges[i+1]-edges[i] > resolution*farthest) || math.IsInf(edges[i+1]-edges[i], 1) {
			t.failKey("edges", "edges has %v after %v, must rise", edges[i+1], edges[i])
			return
		}
	}
	c.Bins, c.Window, c.Edges = last, []float64{edges[0], edges[last]}, edges
}

func readWindow(t table, bins int) []float64 {
	const wanted = "a list of two numbers, [low, high]"
	w := t.numbers("window", wanted)
	if t.failed() {
		return nil
	}
	if len(w) != 2 {
		t.failKey("window", "window is a list of %v, must be two numbers, [low, high]", len(w))
		return nil
	}
	width := w[1] - w[0]
	if !(width > 0) {
		t.failKey("window", "window is [%v, %v], must run from low to high", w[0], w[1])
		return nil
	}
	const resolution = 1e-12
	if math.IsInf(width, 1) || !(width/float64(bins) > resolution*math.Max(math.Abs(w[0]), math.Abs(w[1]))) {
		t.failKey("window", "window is [%v, %v], which %v bins cannot divide", w[0], w[1], bins)
		return nil
	}
	return w
}

// refuseUnderflow finds bins where signal can fall and the background, though
// there is one, has vanished by underflow: nothing would be expected there that
// should be. Empty bins of a template are meant.
func (c *Channel) refuseUnderflow(places []table) {
	if c.Bins == 1 {
		return
	}
	b := c.binning()
	signal := make([]bool, c.Bins)
	background := make([]float64, c.Bins)
	vanished := make([]int, c.Bins) // 1 + index of a process
	f := make([]float64, c.Bins)
	for k, p := range c.Processes {
		if p.Rate == 0 {
			continue
		}
		p.shape.Fill(p.nominal(), f, nil, nil)
		for bin, v := range f {
			switch {
			case p.Signal:
				signal[bin] = signal[bin] || p.Rate*v > 0
			case p.Rate*v == 0 && p.Form.Kind != templateKind.name:
				vanished[bin] = 1 + k
			default:
				background[bin] += p.Rate * v
			}
		}
	}
	for bin := range signal {
		if k := vanished[bin]; k > 0 && signal[bin] && background[bin] == 0 {
			places[k-1].fail(places[k-1].path, "background %q vanishes from %v to %v, where signal can fall: move or shrink the window, or add a background there",
				c.Processes[k-1].Name, b.edge(bin), b.edge(bin+1))
			return
		}
	}
}
