package report

import (
	"fmt"
	"io"
	"math"
	"strings"

	"lumireach/toys"
)

// CrosscheckTable writes the verdict on the asymptotic formulas for people.
func CrosscheckTable(w io.Writer, h Header, r *toys.CrosscheckResult) error {
	title := fmt.Sprintf("formulas against toys · %s\ntolerance %s σ on significances, %s %% on limits and luminosities, %s on chances",
		settings(r.Config, false), luminosity(r.Tolerances.Z), luminosity(100*r.Tolerances.Relative), luminosity(r.Tolerances.Chance))
	if err := head(w, h, title); err != nil {
		return err
	}
	for _, g := range []toys.Group{toys.Discovering, toys.Excluding} {
		io.WriteString(w, fromWords(h, r, g)+"\n")
	}
	io.WriteString(w, "\n")
	if err := overview(h, r).write(w); err != nil {
		return err
	}
	details := details(h, r)
	if len(details.lines) > details.rule {
		io.WriteString(w, "\n")
		if err := details.write(w); err != nil {
			return err
		}
	}
	return foot(w, append(reasonsOf(r), r.Notes...), r.Cautions)
}

// reasonsOf tells each kind of reason once, as it is where it applies first, and
// how far it goes.
func reasonsOf(r *toys.CrosscheckResult) []string {
	var kinds []string
	var first, last = map[string]float64{}, map[string]float64{}
	texts := map[string]string{}
	for _, p := range r.Points {
		for _, reason := range p.Reasons {
			kind, text, _ := strings.Cut(reason, ": ")
			if _, known := texts[kind]; !known {
				kinds = append(kinds, kind)
				first[kind], texts[kind] = p.Luminosity, text
			}
			last[kind] = p.Luminosity
		}
	}
	var out []string
	for _, kind := range kinds {
		where := "at " + luminosity(first[kind])
		if last[kind] != first[kind] {
			where += " to " + luminosity(last[kind])
		}
		out = append(out, where+": "+kind+": "+texts[kind])
	}
	return out
}

// fromWords says from where on formulas may be printed.
func fromWords(h Header, r *toys.CrosscheckResult, g toys.Group) string {
	if from := r.From[g]; !math.IsNaN(from) {
		return fmt.Sprintf("%s: the formulas may be printed from %s %s on.", g, luminosity(from), h.Unit)
	}
	return fmt.Sprintf("%s: at the last luminosity not all numbers of the formulas are good (%s).", g, r.FromWhy[g])
}

// part is a column of the overview.
type part struct {
	name string
	of   func(quantity string) bool
}

var parts = []part{
	{"tails to 5σ", func(q string) bool { return strings.HasPrefix(q, "significance of q0") }},
	{"median Z", func(q string) bool { return q == "median Z" }},
	{"chances", func(q string) bool { return strings.HasPrefix(q, "chance") }},
	{"limits", func(q string) bool { return strings.HasSuffix(q, "limit on μ") }},
	{"q̃ at the limit", func(q string) bool { return strings.Contains(q, "q̃") }},
}

// overview has the worst verdict of each part at each luminosity.
func overview(h Header, r *toys.CrosscheckResult) *grid {
	g := &grid{gaps: []int{0, 4}}
	row, unit := []string{"luminosity"}, []string{"[" + h.Unit + "]"}
	for _, p := range parts {
		row = append(row, p.name)
	}
	g.add(row...)
	g.add(unit...)
	g.header()
	for _, point := range r.Points {
		row := []string{luminosity(point.Luminosity)}
		for _, p := range parts {
			row = append(row, worst(point.Comparisons, p))
		}
		g.add(row...)
	}
	return g
}

// worst is the verdict of the part that is farthest from good.
func worst(comparisons []toys.Comparison, p part) string {
	rank := map[toys.Verdict]int{toys.Good: 1, toys.Undecided: 2, toys.Untested: 3, toys.Off: 4}
	var found toys.Verdict
	for _, c := range comparisons {
		if p.of(c.Quantity) && rank[c.Verdict] > rank[found] {
			found = c.Verdict
		}
	}
	if found == "" {
		return dash
	}
	return string(found)
}

// details are the numbers behind every verdict that is not good, and the goals.
func details(h Header, r *toys.CrosscheckResult) *grid {
	g := &grid{words: 2, gaps: []int{0, 3, 3}}
	exact := false
	for _, c := range r.Goals {
		exact = exact || !math.IsNaN(c.Exact)
	}
	add := func(at string, c toys.Comparison) {
		row := []string{at, c.Quantity, plain(c.Formula, 3), comparedToys(c)}
		if exact {
			row = append(row, plain(c.Exact, exactDigits))
		}
		g.add(append(row, c.String())...)
	}
	titles := []string{"luminosity", "what", "formula", "toys"}
	if exact {
		titles = append(titles, "exact")
	}
	g.add(append(titles, "verdict")...)
	g.add("[" + h.Unit + "]")
	g.header()
	for _, p := range r.Points {
		at := luminosity(p.Luminosity)
		for _, c := range p.Comparisons {
			if c.Verdict != toys.Good {
				add(at, c)
				at = ""
			}
		}
	}
	at := "goals"
	for _, c := range r.Goals {
		if !math.IsNaN(c.Formula) {
			add(at, c)
			at = ""
		}
	}
	return g
}

func comparedToys(c toys.Comparison) string { return measured(c.Toys, c.Error) }

type crosscheckJSON struct {
	Format        int                   `json:"format"`
	Command       string                `json:"command"`
	Version       string                `json:"version"`
	Scenario      scenarioJSON          `json:"scenario"`
	Settings      settingsJSON          `json:"settings"`
	Tolerances    tolerancesJSON        `json:"tolerances"`
	From          map[string]fromJSON   `json:"good_from"`
	Points        []crosscheckPointJSON `json:"points"`
	Goals         []comparisonJSON      `json:"goals"`
	Distributions []distributionJSON    `json:"distributions"`
	Notes         []string              `json:"notes,omitempty"`
	Cautions      []string              `json:"cautions"`
}

type tolerancesJSON struct {
	Relative number `json:"relative"`
	Z        number `json:"z"`
	Chance   number `json:"chance"`
}

type fromJSON struct {
	Luminosity number `json:"luminosity"`
	Why        string `json:"why,omitempty"`
}

type crosscheckPointJSON struct {
	Luminosity  number           `json:"luminosity"`
	Comparisons []comparisonJSON `json:"comparisons"`
	Reasons     []string         `json:"reasons,omitempty"`
}

type comparisonJSON struct {
	Quantity        string  `json:"quantity"`
	Group           string  `json:"group"`
	Kind            string  `json:"kind"`
	Formula         number  `json:"formula"`
	Toys            number  `json:"toys"`
	Error           number  `json:"toys_error"`
	Exact           *number `json:"exact,omitempty"`
	Difference      number  `json:"difference"`
	DifferenceError number  `json:"difference_error"`
	Tolerance       number  `json:"tolerance"`
	Verdict         string  `json:"verdict"`
	MoreToys        int     `json:"more_toys,omitempty"`
	Why             string  `json:"why,omitempty"`
}

func comparisonsOf(list []toys.Comparison) []comparisonJSON {
	var out []comparisonJSON
	for _, c := range list {
		j := comparisonJSON{
			Quantity: c.Quantity, Group: string(c.Group), Kind: string(c.Kind),
			Formula: number(c.Formula), Toys: number(c.Toys), Error: number(errorOf(c.Toys, c.Error)), Exact: optional(c.Exact),
			Difference: number(c.Difference), DifferenceError: number(errorOf(c.Difference, c.DError)), Tolerance: number(c.Tolerance),
			Verdict: string(c.Verdict), MoreToys: c.MoreToys,
		}
		if c.Verdict == toys.Untested {
			j.Why = c.Why
		}
		out = append(out, j)
	}
	return out
}

type distributionJSON struct {
	Statistic   string   `json:"statistic"`
	Hypothesis  string   `json:"hypothesis"`
	Luminosity  number   `json:"luminosity"`
	Edges       []number `json:"root_edges"`
	Probability []number `json:"toys"`
	Error       []number `json:"toys_error"`
	Formula     []number `json:"formula"`
}

func numbers(values []float64) []number {
	out := make([]number, len(values))
	for i, v := range values {
		out[i] = number(v)
	}
	return out
}

// CrosscheckJSON writes the verdict with all distributions for programs.
func CrosscheckJSON(w io.Writer, h Header, r *toys.CrosscheckResult) error {
	out := crosscheckJSON{
		Format: format, Command: h.Command, Version: h.Version,
		Scenario: scenarioOf(h), Settings: settingsOf(r.Config),
		Tolerances: tolerancesJSON{number(r.Tolerances.Relative), number(r.Tolerances.Z), number(r.Tolerances.Chance)},
		From:       map[string]fromJSON{},
		Goals:      comparisonsOf(r.Goals),
		Notes:      r.Notes,
		Cautions:   r.Cautions,
	}
	for g, from := range r.From {
		out.From[string(g)] = fromJSON{number(from), r.FromWhy[g]}
	}
	for _, p := range r.Points {
		out.Points = append(out.Points, crosscheckPointJSON{number(p.Luminosity), comparisonsOf(p.Comparisons), p.Reasons})
	}
	for _, d := range r.Distributions {
		out.Distributions = append(out.Distributions, distributionJSON{
			d.Statistic, d.Hypothesis, number(d.Luminosity), numbers(d.Edges), numbers(d.Probability), numbers(d.Error), numbers(d.Formula),
		})
	}
	return writeJSON(w, out)
}
