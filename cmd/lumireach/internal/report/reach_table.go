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
	withToys, withExact := r.Config.Toys > 0, r.Points[0].Exact != nil
	var reasons once
	engines := []string{"formula"}
	if withToys {
		engines = append(engines, "toys")
	}
	if withExact {
		engines = append(engines, "exact")
	}
	g := grid{gaps: []int{0}}
	title, names := []string{"luminosity"}, []string{"[" + h.Unit + "]"}
	for _, block := range []string{"median Z", "chance of 5σ", "median limit on μ"} {
		title = append(title, block)
		for range engines[1:] {
			title = append(title, across)
		}
		if len(engines) > 1 {
			names = append(names, engines...)
		}
		g.gaps = append(g.gaps, 4)
		for range engines[1:] {
			g.gaps = append(g.gaps, 3)
		}
	}
	g.add(title...)
	g.add(names...)
	g.header()
	oneEvent := false
	for _, p := range r.Points {
		f := p.Formula
		reasons.add(f.Discovery.Why)
		reasons.add(f.Exclusion.Why)
		z, chance, limit := []string{plainZ(f.Discovery.Z.Median)}, []string{percent(f.Discovery.Chance5)}, []string{plain(f.Exclusion.MuUp.Median, 3)}
		if withToys {
			d, x := p.Toys.Discovery, p.Toys.Exclusion
			z = append(z, toyZ(d))
			chance = append(chance, measuredPercent(d.Chance5, d.Chance5Error))
			limit = append(limit, toyLimit(x.MuUp.Median, x.MuUpError.Median, x.MuUpOther.Median))
			reasons.missing(d.Z.Median, p.Luminosity, d.Why)
			reasons.missing(d.Chance5, p.Luminosity, d.ChanceWhy)
			reasons.missing(x.MuUp.Median, p.Luminosity, x.Why)
		}
		if withExact {
			d, x := p.Exact.Discovery, p.Exact.Exclusion
			z = append(z, plain(d.Z.Median, exactDigits))
			chance = append(chance, percent(d.Chance5))
			limit = append(limit, plain(x.MuUp.Median, exactDigits))
			reasons.missing(d.Z.Median, p.Luminosity, d.Why)
			reasons.missing(x.MuUp.Median, p.Luminosity, x.Why)
		}
		row := append([]string{luminosity(p.Luminosity)}, z...)
		row = append(append(row, chance...), limit...)
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
	if withExact {
		io.WriteString(w, "\n")
		if err := exactGoalsTable(h, r, &reasons).write(w); err != nil {
			return err
		}
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
		f := goal.Formula
		row := []string{goalName(goal), goalPlain(f.Luminosity)}
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

// exactDigits are those of numbers without error.
const exactDigits = 4

// exactGoalsTable tells, for each goal, the first luminosity that reaches it and
// that after which it is always reached.
func exactGoalsTable(h Header, r *toys.ReachResult, reasons *once) *grid {
	g := &grid{words: 1, gaps: []int{0, 4, 3, 3}}
	g.add("exact ["+h.Unit+"], first and always after", "half of experiments", "80 %", "90 %")
	g.header()
	for _, goal := range r.Goals {
		row := []string{goalName(goal)}
		for k, first := range goal.Exact.First {
			row = append(row, firstAndAlways(first, goal.Exact.AlwaysAfter[k]))
			if why := goal.Exact.Why[k]; why != "" {
				reasons.add(goal.Name + ": " + why)
			}
		}
		g.add(row...)
	}
	return g
}

func firstAndAlways(first, always float64) string {
	a, b := plain(first, exactDigits), plain(always, exactDigits)
	if a == b {
		return a
	}
	return a + ", " + b
}

func goalName(g toys.Goal) string {
	if g.Name == "exclusion" {
		return fmt.Sprintf("exclusion of μ = 1, %s %%", luminosity(100*g.Confidence))
	}
	return fmt.Sprintf("%s, %sσ", g.Name, luminosity(g.Z))
}

func goalPlain(l float64) string { return plain(l, 3) }
