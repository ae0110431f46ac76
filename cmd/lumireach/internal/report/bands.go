package report

import (
	"encoding/csv"
	"io"

	"lumireach/toys"
)

// BandsTable writes expected-limit bands for people.
func BandsTable(w io.Writer, h Header, r *toys.BandsResult) error {
	if err := head(w, h, "expected upper limits on μ · "+settings(r.Config, true)); err != nil {
		return err
	}
	var reasons once
	g := grid{words: 2, gaps: []int{0, 3}}
	g.add("luminosity", "", "−2σ", "−1σ", "median", "+1σ", "+2σ")
	g.add("[" + h.Unit + "]")
	g.header()
	for _, p := range r.Points {
		row := []string{luminosity(p.Luminosity), "formula"}
		for _, mu := range list(p.Formula.MuUp) {
			row = append(row, plain(mu, 3))
		}
		reasons.add(p.Formula.Why)
		g.add(row...)
		if x := p.Toys; x != nil {
			row := []string{"", "toys"}
			errs, others := list(x.MuUpError), list(x.MuUpOther)
			for i, mu := range list(x.MuUp) {
				row = append(row, toyLimit(mu, errs[i], others[i]))
			}
			for _, mu := range list(x.MuUp) {
				reasons.missing(mu, p.Luminosity, x.Why)
			}
			g.add(row...)
		}
		if x := p.Exact; x != nil {
			row := []string{"", "exact"}
			for _, mu := range list(x.MuUp) {
				row = append(row, plain(mu, exactDigits))
				reasons.missing(mu, p.Luminosity, x.Why)
			}
			g.add(row...)
		}
	}
	if err := g.write(w); err != nil {
		return err
	}
	return foot(w, append(reasons, r.Notes...), r.Cautions)
}

// list is a band from its lower end.
func list(b toys.Band) [5]float64 {
	return [5]float64{b.Minus2, b.Minus1, b.Median, b.Plus1, b.Plus2}
}

type bandsJSON struct {
	Format   int              `json:"format"`
	Command  string           `json:"command"`
	Version  string           `json:"version"`
	Scenario scenarioJSON     `json:"scenario"`
	Settings settingsJSON     `json:"settings"`
	Points   []bandsPointJSON `json:"points"`
	Notes    []string         `json:"notes,omitempty"`
	Cautions []string         `json:"cautions"`
}

type bandsPointJSON struct {
	Luminosity number                 `json:"luminosity"`
	Exclusion  engines[exclusionJSON] `json:"exclusion"`
}

// BandsJSON writes expected-limit bands for programs.
func BandsJSON(w io.Writer, h Header, r *toys.BandsResult) error {
	out := bandsJSON{
		Format: format, Command: h.Command, Version: h.Version,
		Scenario: scenarioOf(h), Settings: settingsOf(r.Config),
		Notes: r.Notes, Cautions: r.Cautions,
	}
	out.Settings.Mu = nil // plays no part
	for _, p := range r.Points {
		point := bandsPointJSON{number(p.Luminosity), engines[exclusionJSON]{Asymptotic: exclusionOf(p.Formula, false)}}
		if p.Toys != nil {
			x := exclusionOf(*p.Toys, true)
			point.Exclusion.Toys = &x
		}
		if p.Exact != nil {
			x := exclusionOf(*p.Exact, false)
			point.Exclusion.Exact = &x
		}
		out.Points = append(out.Points, point)
	}
	return writeJSON(w, out)
}

// BandsCSV writes one row for each luminosity and engine.
func BandsCSV(w io.Writer, _ Header, r *toys.BandsResult) error {
	c := csv.NewWriter(w)
	header := []string{"luminosity", "engine"}
	for _, name := range []string{"exclusion.mu_up", "exclusion.mu_up_error", "exclusion.mu_up_other"} {
		header = append(header, bandNames(name)...)
	}
	c.Write(append(header, "exclusion.why"))
	for _, p := range r.Points {
		row := append(fields(true, p.Luminosity), "asymptotic")
		row = append(row, exclusionFields(p.Formula, false)...)
		c.Write(append(row, p.Formula.Why))
		if x := p.Toys; x != nil {
			row := append(fields(true, p.Luminosity), "toys")
			row = append(row, exclusionFields(*x, true)...)
			c.Write(append(row, x.Why))
		}
		if x := p.Exact; x != nil {
			row := append(fields(true, p.Luminosity), "exact")
			row = append(row, exclusionFields(*x, false)...)
			c.Write(append(row, x.Why))
		}
	}
	c.Flush()
	return c.Error()
}
