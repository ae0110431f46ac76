package toys

import (
	"fmt"
	"math"
)

// Tolerances are how far the formulas may be off.
type Tolerances struct {
	Relative float64 // of limits and luminosities, such as 0.05
	Z        float64 // of significances, such as 0.1
	Chance   float64 // of probabilities of the order of one, such as 0.02
}

// Verdict says whether a number of the formulas may be used.
type Verdict string

const (
	// Good: the difference is surely within the tolerance.
	Good Verdict = "good"
	// Off: it is surely not.
	Off Verdict = "off"
	// Undecided: more toys are needed to tell.
	Undecided Verdict = "not decided"
	// Untested: the toys give no number.
	Untested Verdict = "not tested"
)

// Comparison is one number of the formulas against the toys, and exact sums
// where there are any.
type Comparison struct {
	Quantity   string  // in words
	Group      Group   // what it is part of
	Luminosity float64 // NaN for a goal
	Formula    float64
	Toys       float64
	Error      float64 // of Toys
	Exact      float64 // NaN where there is none
	Kind       Kind
	Difference float64 // of toys, or exact sums, and formula, in the unit of its tolerance
	DError     float64 // of Difference
	Tolerance  float64
	Verdict    Verdict
	MoreToys   int    // per luminosity and hypothesis, that would probably decide
	Why        string // of what is not tested
}

// Group is a part of the answers.
type Group string

const (
	Discovering Group = "discovery"
	Excluding   Group = "exclusion"
)

// Kind is how two numbers are compared.
type Kind string

const (
	Significances Kind = "significance" // by their difference in standard deviations
	Chances       Kind = "chance"       // by their difference
	Ratios        Kind = "ratio"        // by their relative difference
)

// sure is how many standard errors a verdict stands on: of differences right at
// the tolerance one in 44 gets a wrong one, and fewer away from it.
const sure = 2

// judge compares by the exact number where there is one, else by the toys.
func (c *Comparison) judge(t Tolerances, toys int, exactToo bool) {
	value, err := c.Toys, c.Error
	if exactToo && !math.IsNaN(c.Exact) {
		value, err = c.Exact, 0
	}
	c.Difference, c.DError = value-c.Formula, err
	switch c.Kind {
	case Significances:
		c.Tolerance = t.Z
	case Chances:
		c.Tolerance = t.Chance
	case Ratios:
		c.Tolerance = t.Relative
		c.Difference /= value
		c.DError /= math.Abs(value)
	}
	size := math.Abs(c.Difference)
	switch {
	case math.IsNaN(c.Difference) || math.IsNaN(c.DError):
		c.Verdict = Untested
	case size+sure*c.DError <= c.Tolerance:
		c.Verdict = Good
	case size-sure*c.DError > c.Tolerance:
		c.Verdict = Off
	default:
		c.Verdict = Undecided
		distance := math.Max(math.Abs(size-c.Tolerance), c.Tolerance/20)
		growth := math.Pow(sure*c.DError/distance, 2)
		c.MoreToys = max(toys/2, int(math.Ceil(growth*float64(toys)))-toys)
	}
}

// String is the verdict in words.
func (c *Comparison) String() string {
	unit := map[Kind]string{Significances: "σ", Chances: "", Ratios: " %"}[c.Kind]
	scale := map[Kind]float64{Significances: 1, Chances: 1, Ratios: 100}[c.Kind]
	switch c.Verdict {
	case Off:
		if c.DError == 0 {
			return fmt.Sprintf("off by %.2g%s", scale*math.Abs(c.Difference), unit)
		}
		return fmt.Sprintf("off by %.2g ± %.1g%s: use toys", scale*math.Abs(c.Difference), scale*c.DError, unit)
	case Undecided:
		return fmt.Sprintf("not decided: %d more toys needed", c.MoreToys)
	}
	return string(c.Verdict)
}
