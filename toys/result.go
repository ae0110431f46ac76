package toys

import "math"

// A number that cannot be given is NaN in a result, with the reason in the Why
// beside it; it is never zero and never a guess.

// Band holds one quantity at the five quantiles Φ(-2), Φ(-1), ½, Φ(1), Φ(2) of
// the expected experiments.
type Band struct {
	Minus2, Minus1, Median, Plus1, Plus2 float64
}

// Tail says how far the toys of the null hypothesis reach.
type Tail struct {
	ReachesZ      float64 // the largest significance that they can tell
	EffectiveToys float64 // (Σw)²/Σw²
	LargestShare  float64 // of one toy in the sum of weights
}

// Discovery is what one engine says about discovery at one luminosity and the
// hoped-for μ. Errors are Monte Carlo standard errors; formulas have none and
// leave them zero.
type Discovery struct {
	Z, ZError    Band // significance in standard deviations, cut at 0
	ZAtLeast     Band // a lower bound where Z is NaN because the tail does not reach so far, else NaN
	Chance3      float64
	Chance3Error float64
	Chance5      float64
	Chance5Error float64
	ChanceOne    float64 // P(an event where no background can fall), NaN where there is no such bin
	Toys         int     // signal-plus-background pseudo-experiments thrown
	NullToys     int     // background-only pseudo-experiments thrown
	FailedFits   int     // of both
	Tail         *Tail   // nil for formulas
	Why          string  // for any Z that is NaN
	ChanceWhy    string  // for any chance that is NaN
}

// Exclusion is what one engine says about the CLs upper limit on μ at one
// luminosity if there is no signal.
type Exclusion struct {
	MuUp, MuUpError Band
	// MuUpOther is the second value of a quantile that lies, within its Monte
	// Carlo error, on the edge between two discrete outcomes, else NaN.
	MuUpOther  Band
	Toys       int
	FailedFits int
	Why        string // for any MuUp that is NaN
}

// Answer is what one engine says at one luminosity.
type Answer struct {
	Discovery Discovery
	Exclusion Exclusion
}

// ExactAnswer is what exact sums over all outcomes say at one luminosity.
type ExactAnswer struct {
	Answer
	Coverage    float64 // probability that the limit is not below μ = 1 if that is true
	CoverageWhy string  // for a Coverage that is NaN
}

// Point lays the engines side by side at one luminosity.
type Point struct {
	Luminosity    float64
	Formula       Answer
	Toys          *Answer      // nil with Config.Toys = 0
	Exact         *ExactAnswer // nil where outcomes cannot be enumerated
	SmallestCount float64      // smallest expected count of a bin in which signal falls, at μ, in events
}

// GoalAnswer is the luminosity that one engine gives for a goal, for half, 80 %
// and 90 % of all experiments, in the scenario's unit.
type GoalAnswer struct {
	Luminosity, Error     float64
	Luminosity80, Error80 float64
	Luminosity90, Error90 float64
	BeyondList            bool    // Luminosity lies outside the listed ones
	Plateau               float64 // value at infinite luminosity of a goal never reached: a Z, or a μ for exclusion; else NaN
	Why, Why80, Why90     string  // for a luminosity that is NaN
	Toys, FailedFits      int     // thrown for it, of all hypotheses
}

// Goal is one aim of a search.
type Goal struct {
	Name       string  // "evidence", "discovery" or "exclusion"
	Z          float64 // of evidence and discovery, else 0
	Confidence float64 // of exclusion, else 0
	Formula    GoalAnswer
	Toys       *GoalAnswer // nil with Config.Toys = 0
	Exact      *ExactGoal  // nil where outcomes cannot be enumerated
}

// Check compares weighted with plain toys of the null: those of all tails that
// were thrown from the null itself pass a threshold as often as the weights say,
// within the fluctuation of a Poisson count.
type Check struct {
	Z        float64 // the threshold, q0 >= Z²
	Plain    int     // toys thrown from the null itself
	Passing  int     // of them
	Expected float64 // of them, by the weighted toys
	Pull     float64 // (Passing - Expected) / standard error
}

// ReachResult is the expected reach of a search.
type ReachResult struct {
	Config   Config
	Points   []Point
	Goals    []Goal
	Checks   []Check  // at 2σ and 3σ; none without toys
	Notes    []string // how the run went, such as the toys that a precision took
	Cautions []string // each once, only where it applies
}

// BandsPoint is the expected limits of the engines at one luminosity.
type BandsPoint struct {
	Luminosity float64
	Formula    Exclusion
	Toys       *Exclusion // nil with Config.Toys = 0
	Exact      *Exclusion // nil where outcomes cannot be enumerated
}

// BandsResult is the expected-limit bands on μ against luminosity.
type BandsResult struct {
	Config   Config
	Points   []BandsPoint
	Notes    []string // how the run went
	Cautions []string // each once, only where it applies
}

// list is the band from its lower end.
func (b Band) list() [5]float64 { return [5]float64{b.Minus2, b.Minus1, b.Median, b.Plus1, b.Plus2} }

func band(v [5]float64) Band { return Band{v[0], v[1], v[2], v[3], v[4]} }

// noBand has no number in it.
func noBand() Band {
	n := math.NaN()
	return Band{n, n, n, n, n}
}
