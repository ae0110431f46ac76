package report

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"unicode/utf8"

	"lumireach/toys"
)

// width of a table's prose.
const width = 92

// head writes the title, with the source at the right, and the settings.
func head(w io.Writer, h Header, settings string) error {
	source := h.Source
	if source == demonstration {
		source = "demonstration scenario"
	}
	space := max(2, width-utf8.RuneCountInString(h.Title)-utf8.RuneCountInString(source))
	_, err := fmt.Fprintf(w, "%s%s%s\n%s\n\n", h.Title, strings.Repeat(" ", space), source, settings)
	return err
}

func settings(c toys.Config, exclusionOnly bool) string {
	var parts []string
	if !exclusionOnly {
		parts = append(parts, "signal strength "+luminosity(c.Mu))
	}
	parts = append(parts, luminosity(100*c.Confidence)+" % confidence")
	if c.Toys == 0 {
		parts = append(parts, "formulas only")
	} else {
		parts = append(parts, fmt.Sprintf("%d toys", c.Toys), fmt.Sprintf("nuisances %s", c.Nuisances), fmt.Sprintf("seed %d", c.Seed))
	}
	return strings.Join(parts, " · ")
}

// foot writes notes and cautions under a table.
func foot(w io.Writer, notes, cautions []string) error {
	text := ""
	if len(notes) > 0 {
		text = "\n" + paragraphs(notes, dash+" ", width)
	}
	_, err := io.WriteString(w, text+"\n"+paragraphs(cautions, "• ", width))
	return err
}

// once collects reasons, each once.
type once []string

func (o *once) add(reason string) {
	if reason == "" {
		return
	}
	if !slices.Contains(*o, reason) {
		*o = append(*o, reason)
	}
}

// missing adds the reason of a number that is not there, with its luminosity
// unless it holds for all of them.
func (o *once) missing(value, at float64, reason string) {
	if !math.IsNaN(value) || slices.Contains(*o, reason) {
		return
	}
	o.add("at " + luminosity(at) + ": " + reason)
}

// ReachTable writes the reach of a search for people.
func ReachTable(w io.Writer, h Header, r *toys.ReachResult) error {
	if err := head(w, h, settings(r.Config, false)); err != nil {
		return err
	}
	withToys := r.Config.Toys > 0
	var reasons once
	g := grid{gaps: []int{0, 4, 3, 4, 3, 4, 3}}
	if withToys {
		g.add("luminosity", "median Z", across, "chance of 5σ", across, "median limit on μ", across)
		g.add("["+h.Unit+"]", "formula", "toys", "formula", "toys", "formula", "toys")
	} else {
		g.add("luminosity", "median Z", "chance of 5σ", "median limit on μ")
		g.add("[" + h.Unit + "]")
	}
	g.header()
	oneEvent := false
	for _, p := range r.Points {
		f := p.Formula
		reasons.add(f.Discovery.Why)
		reasons.add(f.Exclusion.Why)
		row := []string{luminosity(p.Luminosity), plainZ(f.Discovery.Z.Median)}
		if withToys {
			row = append(row, toyZ(p.Toys.Discovery))
		}
		row = append(row, percent(f.Discovery.Chance5))
		if withToys {
			row = append(row, measuredPercent(p.Toys.Discovery.Chance5, p.Toys.Discovery.Chance5Error))
		}
		row = append(row, plain(f.Exclusion.MuUp.Median, 3))
		if withToys {
			x := p.Toys.Exclusion
			row = append(row, toyLimit(x.MuUp.Median, x.MuUpError.Median, x.MuUpOther.Median))
			reasons.missing(p.Toys.Discovery.Z.Median, p.Luminosity, p.Toys.Discovery.Why)
			reasons.missing(p.Toys.Discovery.Chance5, p.Luminosity, p.Toys.Discovery.ChanceWhy)
			reasons.missing(x.MuUp.Median, p.Luminosity, x.Why)
		}
		g.add(row...)
		oneEvent = oneEvent || !math.IsNaN(f.Discovery.ChanceOne)
	}
	if err := g.write(w); err != nil {
		return err
	}
	if oneEvent {
		io.WriteString(w, "\n")
		g := grid{}
		g.add("luminosity", "chance of an event")
		g.add("["+h.Unit+"]", "where no background falls")
		g.header()
		for _, p := range r.Points {
			g.add(luminosity(p.Luminosity), percent(p.Formula.Discovery.ChanceOne))
		}
		if err := g.write(w); err != nil {
			return err
		}
	}
	io.WriteString(w, "\n")
	if err := goalsTable(h, r, &reasons).write(w); err != nil {
		return err
	}
	notes := append(reasons, r.Notes...)
	for _, c := range r.Checks {
		notes = append(notes, fmt.Sprintf("check of the weights: %d of %d plain background-only toys reach q0 of %s; the weighted ones expect %s",
			c.Passing, c.Plain, luminosity(c.Z*c.Z), plain(c.Expected, 3)))
	}
	return foot(w, notes, r.Cautions)
}

func plainZ(z float64) string {
	if math.IsNaN(z) {
		return dash
	}
	return fixed(z, 2)
}

func toyZ(d toys.Discovery) string {
	if math.IsNaN(d.Z.Median) && !math.IsNaN(d.ZAtLeast.Median) {
		return atLeast(d.ZAtLeast.Median)
	}
	return measured(d.Z.Median, d.ZError.Median)
}

// toyLimit prints a limit, and both values where it lies on the edge of two.
func toyLimit(mu, err, other float64) string {
	if math.IsNaN(other) {
		return measured(mu, err)
	}
	return plain(mu, 3) + " or " + plain(other, 3)
}

func goalsTable(h Header, r *toys.ReachResult, reasons *once) *grid {
	g := &grid{words: 1, gaps: []int{0, 4, 3, 4, 3}}
	withToys := r.Config.Toys > 0
	title := "expected [" + h.Unit + "]"
	if withToys {
		g.add(title, "formula", "toys", "80 % of experiments", "90 %")
	} else {
		g.add(title, "formula", "80 % of experiments", "90 %")
	}
	g.header()
	for _, goal := range r.Goals {
		name := fmt.Sprintf("%s, %sσ", goal.Name, luminosity(goal.Z))
		if goal.Name == "exclusion" {
			name = fmt.Sprintf("exclusion of μ = 1, %s %%", luminosity(100*goal.Confidence))
		}
		f := goal.Formula
		row := []string{name, goalPlain(f.Luminosity)}
		if !withToys {
			g.add(append(row, goalPlain(f.Luminosity80), goalPlain(f.Luminosity90))...)
		} else {
			t := goal.Toys
			g.add(append(row, measured(t.Luminosity, t.Error), measured(t.Luminosity80, t.Error80), measured(t.Luminosity90, t.Error90))...)
			for _, why := range []string{t.Why, t.Why80, t.Why90} {
				if why != "" {
					reasons.add(goal.Name + ": " + why)
				}
			}
		}
		for _, why := range []string{f.Why, f.Why80, f.Why90} {
			if why != "" {
				reasons.add(goal.Name + ": " + why)
			}
		}
	}
	return g
}

func goalPlain(l float64) string { return plain(l, 3) }
