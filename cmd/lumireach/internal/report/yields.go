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

	if len(y.Parameters) > 0 {
		io.WriteString(w, "\n")
		g = grid{words: 6}
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
		if err := g.write(w); err != nil {
			return err
		}
	}
	return foot(w, nil, []string{
		"Smallest bin: the smallest expected count, signal included, of a bin that the signal reaches. Below about 10, trust toys rather than formulas.",
		"The sizes of the uncertainties do not change with luminosity.",
	})
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
	Effects []actsJSON `json:"effects"`
}

type actsJSON struct {
	Channel string `json:"channel"`
	Process string `json:"process"`
	Moves   string `json:"moves"`
	Size    string `json:"size,omitempty"`
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
		out.Channels = append(out.Channels, channel)
	}
	for _, p := range y.Parameters {
		parameter := parameterJSON{Name: p.Name, Kind: string(p.Kind), Effects: []actsJSON{}}
		for _, a := range p.Effects {
			parameter.Effects = append(parameter.Effects, actsJSON{a.Channel, a.Process, a.Moves, a.Size})
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
