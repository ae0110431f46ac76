package report

import (
	"encoding/json"
	"io"
	"math"

	"lumireach/toys"
)

// format is the version of the JSON's layout.
const format = 1

// number is a float64, or null where there is none.
type number float64

// MarshalJSON writes the shortest digits that read back to the same number.
func (n number) MarshalJSON() ([]byte, error) {
	v := float64(n)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return []byte("null"), nil
	}
	return json.Marshal(v)
}

type scenarioJSON struct {
	Title  string `json:"title"`
	Source string `json:"source"`
	SHA256 string `json:"sha256"`
	Unit   string `json:"luminosity_unit"`
}

func scenarioOf(h Header) scenarioJSON { return scenarioJSON{h.Title, h.Source, h.SHA256, h.Unit} }

type settingsJSON struct {
	Seed       uint64  `json:"seed"`
	Toys       int     `json:"toys"`
	Mu         *number `json:"mu,omitempty"`
	Confidence number  `json:"confidence"`
	Nuisances  string  `json:"nuisances"`
}

func settingsOf(c toys.Config) settingsJSON {
	return settingsJSON{c.Seed, c.Toys, optional(c.Mu), number(c.Confidence), string(c.Nuisances)}
}

type bandJSON struct {
	Minus2 number `json:"minus2"`
	Minus1 number `json:"minus1"`
	Median number `json:"median"`
	Plus1  number `json:"plus1"`
	Plus2  number `json:"plus2"`
}

func bandOf(b toys.Band) bandJSON {
	return bandJSON{number(b.Minus2), number(b.Minus1), number(b.Median), number(b.Plus1), number(b.Plus2)}
}

// partJSON is a band of which quantiles without a number are absent.
type partJSON struct {
	Minus2 *number `json:"minus2,omitempty"`
	Minus1 *number `json:"minus1,omitempty"`
	Median *number `json:"median,omitempty"`
	Plus1  *number `json:"plus1,omitempty"`
	Plus2  *number `json:"plus2,omitempty"`
}

// some is what a band has of numbers, or absent where that is none.
func some(b toys.Band) *partJSON {
	out := partJSON{optional(b.Minus2), optional(b.Minus1), optional(b.Median), optional(b.Plus1), optional(b.Plus2)}
	if out == (partJSON{}) {
		return nil
	}
	return &out
}

// errorOf is the error of a value: none where there is no value.
func errorOf(value, err float64) float64 {
	if math.IsNaN(value) {
		return value
	}
	return err
}

func errorsOf(b, errs toys.Band) toys.Band {
	return toys.Band{
		Minus2: errorOf(b.Minus2, errs.Minus2), Minus1: errorOf(b.Minus1, errs.Minus1), Median: errorOf(b.Median, errs.Median),
		Plus1: errorOf(b.Plus1, errs.Plus1), Plus2: errorOf(b.Plus2, errs.Plus2),
	}
}

// optional is a number, or absent where there is none.
func optional(v float64) *number {
	if math.IsNaN(v) {
		return nil
	}
	n := number(v)
	return &n
}

type discoveryJSON struct {
	Z            bandJSON  `json:"z"`
	ZError       *bandJSON `json:"z_error,omitempty"`
	ZAtLeast     *partJSON `json:"z_at_least,omitempty"`
	Why          string    `json:"why,omitempty"`
	Chance3      number    `json:"chance_3"`
	Chance3Error *number   `json:"chance_3_error,omitempty"`
	Chance5      number    `json:"chance_5"`
	Chance5Error *number   `json:"chance_5_error,omitempty"`
	ChanceWhy    string    `json:"chance_why,omitempty"`
	ChanceOne    *number   `json:"chance_of_one_event,omitempty"`
	Toys         *int      `json:"toys,omitempty"`
	NullToys     *int      `json:"null_toys,omitempty"`
	FailedFits   *int      `json:"failed_fits,omitempty"`
	Tail         *tailJSON `json:"tail,omitempty"`
}

type tailJSON struct {
	ReachesZ      number `json:"reaches_z"`
	EffectiveToys number `json:"effective_toys"`
	LargestShare  number `json:"largest_share"`
}

func discoveryOf(d toys.Discovery, thrown bool) discoveryJSON {
	out := discoveryJSON{
		Z: bandOf(d.Z), ZAtLeast: some(d.ZAtLeast), Why: d.Why,
		Chance3: number(d.Chance3), Chance5: number(d.Chance5), ChanceWhy: d.ChanceWhy,
		ChanceOne: optional(d.ChanceOne),
	}
	if thrown {
		errors := bandOf(errorsOf(d.Z, d.ZError))
		chance3, chance5 := number(errorOf(d.Chance3, d.Chance3Error)), number(errorOf(d.Chance5, d.Chance5Error))
		out.ZError, out.Chance3Error, out.Chance5Error = &errors, &chance3, &chance5
		out.Toys, out.NullToys, out.FailedFits = &d.Toys, &d.NullToys, &d.FailedFits
		if d.Tail != nil {
			out.Tail = &tailJSON{number(d.Tail.ReachesZ), number(d.Tail.EffectiveToys), number(d.Tail.LargestShare)}
		}
	}
	return out
}

type exclusionJSON struct {
	MuUp       bandJSON  `json:"mu_up"`
	MuUpError  *bandJSON `json:"mu_up_error,omitempty"`
	MuUpOther  *partJSON `json:"mu_up_other,omitempty"`
	Why        string    `json:"why,omitempty"`
	Coverage   *number   `json:"coverage,omitempty"` // of μ = 1, by exact sums
	Toys       *int      `json:"toys,omitempty"`
	FailedFits *int      `json:"failed_fits,omitempty"`
}

func exclusionOf(x toys.Exclusion, thrown bool) exclusionJSON {
	out := exclusionJSON{MuUp: bandOf(x.MuUp), MuUpOther: some(x.MuUpOther), Why: x.Why}
	if thrown {
		errors := bandOf(errorsOf(x.MuUp, x.MuUpError))
		out.MuUpError = &errors
		out.Toys, out.FailedFits = &x.Toys, &x.FailedFits
	}
	return out
}

type engines[T any] struct {
	Asymptotic T  `json:"asymptotic"`
	Toys       *T `json:"toys,omitempty"`
	Exact      *T `json:"exact,omitempty"`
}

type goalJSON struct {
	Luminosity   number  `json:"luminosity"`
	Error        *number `json:"error,omitempty"`
	Why          string  `json:"why,omitempty"`
	Luminosity80 number  `json:"luminosity_80"`
	Error80      *number `json:"error_80,omitempty"`
	Why80        string  `json:"why_80,omitempty"`
	Luminosity90 number  `json:"luminosity_90"`
	Error90      *number `json:"error_90,omitempty"`
	Why90        string  `json:"why_90,omitempty"`
	BeyondList   bool    `json:"beyond_list"`
	Plateau      number  `json:"plateau"`
	Toys         *int    `json:"toys,omitempty"`
	FailedFits   *int    `json:"failed_fits,omitempty"`
}

func goalOf(g toys.GoalAnswer, thrown bool) goalJSON {
	out := goalJSON{
		Luminosity: number(g.Luminosity), Luminosity80: number(g.Luminosity80), Luminosity90: number(g.Luminosity90),
		Why: g.Why, Why80: g.Why80, Why90: g.Why90,
		BeyondList: g.BeyondList, Plateau: number(g.Plateau),
	}
	if thrown {
		errors := [3]number{
			number(errorOf(g.Luminosity, g.Error)),
			number(errorOf(g.Luminosity80, g.Error80)),
			number(errorOf(g.Luminosity90, g.Error90)),
		}
		out.Error, out.Error80, out.Error90 = &errors[0], &errors[1], &errors[2]
		out.Toys, out.FailedFits = &g.Toys, &g.FailedFits
	}
	return out
}

type reachJSON struct {
	Format   int              `json:"format"`
	Command  string           `json:"command"`
	Version  string           `json:"version"`
	Scenario scenarioJSON     `json:"scenario"`
	Settings settingsJSON     `json:"settings"`
	Points   []reachPointJSON `json:"points"`
	Goals    []reachGoalJSON  `json:"goals"`
	Checks   []checkJSON      `json:"checks,omitempty"`
	Notes    []string         `json:"notes,omitempty"`
	Cautions []string         `json:"cautions"`
}

type checkJSON struct {
	Z        number `json:"z"`
	Plain    int    `json:"plain_toys"`
	Passing  int    `json:"passing"`
	Expected number `json:"expected"`
	Pull     number `json:"pull"`
}

type reachPointJSON struct {
	Luminosity    number                 `json:"luminosity"`
	SmallestCount number                 `json:"smallest_expected_count"`
	Discovery     engines[discoveryJSON] `json:"discovery"`
	Exclusion     engines[exclusionJSON] `json:"exclusion"`
}

type reachGoalJSON struct {
	Goal       string         `json:"goal"`
	Z          *number        `json:"z,omitempty"`
	Confidence *number        `json:"confidence,omitempty"`
	Asymptotic goalJSON       `json:"asymptotic"`
	Toys       *goalJSON      `json:"toys,omitempty"`
	Exact      *exactGoalJSON `json:"exact,omitempty"`
}

// exactGoalJSON has two luminosities for each fraction of experiments.
type exactGoalJSON struct {
	First         number `json:"first"`
	AlwaysAfter   number `json:"always_after"`
	Why           string `json:"why,omitempty"`
	First80       number `json:"first_80"`
	AlwaysAfter80 number `json:"always_after_80"`
	Why80         string `json:"why_80,omitempty"`
	First90       number `json:"first_90"`
	AlwaysAfter90 number `json:"always_after_90"`
	Why90         string `json:"why_90,omitempty"`
}

func exactGoalOf(g *toys.ExactGoal) *exactGoalJSON {
	if g == nil {
		return nil
	}
	return &exactGoalJSON{
		number(g.First[0]), number(g.AlwaysAfter[0]), g.Why[0],
		number(g.First[1]), number(g.AlwaysAfter[1]), g.Why[1],
		number(g.First[2]), number(g.AlwaysAfter[2]), g.Why[2],
	}
}

// ReachJSON writes the reach of a search for programs, format 1.
func ReachJSON(w io.Writer, h Header, r *toys.ReachResult) error {
	out := reachJSON{
		Format: format, Command: h.Command, Version: h.Version,
		Scenario: scenarioOf(h),
		Settings: settingsOf(r.Config),
		Notes:    r.Notes,
		Cautions: r.Cautions,
	}
	for _, p := range r.Points {
		point := reachPointJSON{
			Luminosity: number(p.Luminosity), SmallestCount: number(p.SmallestCount),
			Discovery: engines[discoveryJSON]{Asymptotic: discoveryOf(p.Formula.Discovery, false)},
			Exclusion: engines[exclusionJSON]{Asymptotic: exclusionOf(p.Formula.Exclusion, false)},
		}
		if p.Toys != nil {
			d, x := discoveryOf(p.Toys.Discovery, true), exclusionOf(p.Toys.Exclusion, true)
			point.Discovery.Toys, point.Exclusion.Toys = &d, &x
		}
		if p.Exact != nil {
			d, x := discoveryOf(p.Exact.Discovery, false), exclusionOf(p.Exact.Exclusion, false)
			x.Coverage = optional(p.Exact.Coverage)
			point.Discovery.Exact, point.Exclusion.Exact = &d, &x
		}
		out.Points = append(out.Points, point)
	}
	for _, g := range r.Goals {
		goal := reachGoalJSON{Goal: g.Name, Asymptotic: goalOf(g.Formula, false), Exact: exactGoalOf(g.Exact)}
		if g.Name == "exclusion" {
			goal.Confidence = optional(g.Confidence)
		} else {
			goal.Z = optional(g.Z)
		}
		if g.Toys != nil {
			t := goalOf(*g.Toys, true)
			goal.Toys = &t
		}
		out.Goals = append(out.Goals, goal)
	}
	for _, c := range r.Checks {
		out.Checks = append(out.Checks, checkJSON{number(c.Z), c.Plain, c.Passing, number(c.Expected), number(c.Pull)})
	}
	return writeJSON(w, out)
}

func writeJSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetIndent("", "  ")
	e.SetEscapeHTML(false)
	return e.Encode(v)
}
