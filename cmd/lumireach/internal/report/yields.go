package report

import (
	"fmt"
	"io"
	"math"
	"strings"

	"lumireach/physics"
)

// YieldsTable writes what a scenario expects at one luminosity for people.
func YieldsTable(w io.Writer, h Header, y physics.Yields) error {
	if err := head(w, h, fmt.Sprintf("expected events at %s %s, signal strength 1", luminosity(y.Luminosity), y.Unit)); err != nil {
		return err
	}
	g := grid{words: 3}
	g.add("channel", "process", "shape", "events")
	g.header()
	for _, c := range y.Channels {
		name := c.Name
		for _, p := range append(append([]physics.Expected(nil), c.Signals...), c.Backgrounds...) {
			g.add(name, p.Name, orDash(p.Form.Kind), plain(p.Events, 4))
			name = ""
		}
	}
	if err := g.write(w); err != nil {
		return err
	}

	io.WriteString(w, "\n")
	g = grid{words: 2}
	g.add("channel", "where the signal stands out most", "signal", "background", "s/√(s+b)", "smallest bin")
	g.header()
	for _, c := range y.Channels {
		if c.Best == nil {
			continue
		}
		b := c.Best
		place := "all"
		if !math.IsNaN(b.Low) {
			place = strings.TrimSpace(fmt.Sprintf("%s to %s %s", luminosity(b.Low), luminosity(b.High), c.Unit))
		}
		g.add(c.Name, place, plain(b.Signal, 4), plain(b.Background, 4),
			plain(b.Signal/math.Sqrt(b.Signal+b.Background), 3), plain(c.SmallestTotal, 2))
	}
	if err := g.write(w); err != nil {
		return err
	}

	if err := writeParameters(w, y); err != nil {
		return err
	}
	return foot(w, nil, yieldsNotes(y))
}

func writeParameters(w io.Writer, y physics.Yields) error {
	g := grid{words: 6}
	g.add("parameter", "kind", "channel", "process", "moves", "by")
	g.header()
	for _, p := range y.Parameters {
		name, kind := p.Name, string(p.Kind)
		for _, a := range p.Effects {
			by := a.Size
			if by == "" {
				by = "the data"
			}
			g.add(name, kind, a.Channel, a.Process, a.Moves, by)
			name, kind = "", ""
		}
		if len(p.Effects) == 0 {
			g.add(name, kind, dash, dash, dash, dash)
		}
	}
	name, kind := "simulation", string(physics.Constrained)
	for _, c := range y.Channels {
		sim := c.Simulation
		if sim == nil {
			continue
		}
		moves, by := "rate of one bin", "±"+percentage(sim.Smallest)+" %"
		if sim.Factors > 1 {
			moves = fmt.Sprintf("rates of %d bins", sim.Factors)
			if most := "±" + percentage(sim.Largest) + " %"; most != by {
				by += " to " + most
			}
		}
		g.add(name, kind, c.Name, "all backgrounds", moves, by)
		name, kind = "", ""
	}
	if len(g.lines) == g.rule {
		return nil
	}
	if _, err := io.WriteString(w, "\n"); err != nil {
		return err
	}
	return g.write(w)
}

func percentage(fraction float64) string { return plain(100*fraction, 2) }

// yieldsNotes say how the table is read, as far as it needs saying.
func yieldsNotes(y physics.Yields) []string {
	notes := []string{
		"Smallest bin: the smallest expected count, signal included, of a bin that the signal reaches. Below about 10, trust toys rather than formulas.",
	}
	var shrunk []string
	pairs, templates, simulation := false, false, false
	for _, p := range y.Parameters {
		if p.Shrinks {
			shrunk = append(shrunk, fmt.Sprintf("%s (to %s)", p.Name, plain(p.Scale, 3)))
		}
		for _, a := range p.Effects {
			pairs = pairs || strings.Contains(a.Size, " / ")
			templates = templates || a.Moves == "template"
		}
	}
	for _, c := range y.Channels {
		simulation = simulation || c.Simulation != nil
	}
	if pairs {
		notes = append(notes, "Two sizes are those of +1 and −1 standard deviation.")
	}
	if templates {
		notes = append(notes, "The size of a template's move is the range, over its bins, in which their share of the events changes.")
	}
	if simulation {
		notes = append(notes, "Simulation: the statistical error of the background templates, one factor on the whole background of each bin. It does not change with luminosity.")
	}
	if len(shrunk) == 0 {
		return append(notes, "The sizes of the uncertainties do not change with luminosity.")
	}
	return append(notes, fmt.Sprintf("Shrinking with luminosity, and shown as they are at %s %s: %s. No other size changes.",
		luminosity(y.Luminosity), y.Unit, strings.Join(shrunk, ", ")))
}

func orDash(s string) string {
	if s == "" {
		return dash
	}
	return s
}

type yieldsJSON struct {
	Format     int             `json:"format"`
	Command    string          `json:"command"`
	Version    string          `json:"version"`
	Scenario   scenarioJSON    `json:"scenario"`
	Luminosity number          `json:"luminosity"`
	Channels   []channelJSON   `json:"channels"`
	Parameters []parameterJSON `json:"parameters"`
}

type channelJSON struct {
	Name               string         `json:"name"`
	Unit               string         `json:"unit,omitempty"`
	Window             []float64      `json:"window,omitempty"`
	Bins               int            `json:"bins"`
	Signals            []expectedJSON `json:"signals"`
	Backgrounds        []expectedJSON `json:"backgrounds"`
	Best               *intervalJSON  `json:"best_interval,omitempty"`
	SmallestBackground *number        `json:"smallest_background_bin,omitempty"`
	SmallestTotal      *number        `json:"smallest_bin,omitempty"`
	Simulation         *simulatedJSON `json:"simulation,omitempty"`
}

type simulatedJSON struct {
	Factors  int    `json:"factors"`
	Smallest number `json:"smallest_error"`
	Largest  number `json:"largest_error"`
}

type expectedJSON struct {
	Name   string `json:"name"`
	Shape  string `json:"shape,omitempty"`
	Events number `json:"events"`
}

type intervalJSON struct {
	FirstBin   int     `json:"first_bin"`
	Bins       int     `json:"bins"`
	Low        *number `json:"low,omitempty"`
	High       *number `json:"high,omitempty"`
	Signal     number  `json:"signal"`
	Background number  `json:"background"`
}

type parameterJSON struct {
	Name    string     `json:"name"`
	Kind    string     `json:"kind"`
	Scale   *number    `json:"shrinks_to,omitempty"`
	Effects []actsJSON `json:"effects"`
}

type actsJSON struct {
	Channel string  `json:"channel"`
	Process string  `json:"process"`
	Moves   string  `json:"moves"`
	Size    string  `json:"size,omitempty"`
	Up      *number `json:"up,omitempty"`
	Down    *number `json:"down,omitempty"`
	Shift   *number `json:"shift,omitempty"`
}

// YieldsJSON writes what a scenario expects at one luminosity for programs.
func YieldsJSON(w io.Writer, h Header, y physics.Yields) error {
	out := yieldsJSON{
		Format: format, Command: h.Command, Version: h.Version,
		Scenario:   scenarioOf(h),
		Luminosity: number(y.Luminosity),
		Parameters: []parameterJSON{},
	}
	for _, c := range y.Channels {
		channel := channelJSON{
			Name: c.Name, Unit: c.Unit, Window: c.Window, Bins: c.Bins,
			Signals: expectedOf(c.Signals), Backgrounds: expectedOf(c.Backgrounds),
			SmallestBackground: optional(c.SmallestBackground), SmallestTotal: optional(c.SmallestTotal),
		}
		if b := c.Best; b != nil {
			channel.Best = &intervalJSON{b.FirstBin, b.Bins, optional(b.Low), optional(b.High), number(b.Signal), number(b.Background)}
		}
		if sim := c.Simulation; sim != nil {
			channel.Simulation = &simulatedJSON{sim.Factors, number(sim.Smallest), number(sim.Largest)}
		}
		out.Channels = append(out.Channels, channel)
	}
	for _, p := range y.Parameters {
		parameter := parameterJSON{Name: p.Name, Kind: string(p.Kind), Effects: []actsJSON{}}
		if p.Shrinks {
			parameter.Scale = optional(p.Scale)
		}
		for _, a := range p.Effects {
			acts := actsJSON{Channel: a.Channel, Process: a.Process, Moves: a.Moves, Size: a.Size}
			switch {
			case a.Up > 0:
				acts.Up, acts.Down = optional(a.Up), optional(a.Down)
			case a.Shift != 0:
				acts.Shift = optional(a.Shift)
			}
			parameter.Effects = append(parameter.Effects, acts)
		}
		out.Parameters = append(out.Parameters, parameter)
	}
	return writeJSON(w, out)
}

func expectedOf(list []physics.Expected) []expectedJSON {
	out := []expectedJSON{}
	for _, p := range list {
		out = append(out, expectedJSON{p.Name, p.Form.Kind, number(p.Events)})
	}
	return out
}
