package toys

import "time"

// Config is how hard to work and for what; its zero value with Luminosities
// set runs the formulas alone.
type Config struct {
	// Luminosities to report, in the scenario's unit, each > 0 and finite.
	Luminosities []float64
	// Toys is how many pseudo-experiments to throw per luminosity and
	// hypothesis. Zero means formulas only; otherwise at least MinToys.
	Toys int
	// Seed of every random stream. Equal seeds give equal bytes.
	Seed uint64
	// Workers bounds the goroutines. It never changes a result. Zero means
	// all cores.
	Workers int
	// Mu is the signal strength that is hoped for, of discovery only, from
	// LeastMu to MostMu. Zero means 1.
	Mu float64
	// Confidence of limits, between 0.5 and 1. Zero means 0.95.
	Confidence float64
	// Precision, where above 0, replaces Toys: they are raised until the relative
	// errors of the median significance and limit and of the goals are below it.
	Precision float64
	// Within bounds the time of Precision; zero means no bound. What was reached
	// by then is the result.
	Within time.Duration
	// Nuisances says what toys do with nuisance parameters. Empty means Fixed.
	Nuisances Nuisances
	// WithoutExact leaves out the exact sums of searches that have them.
	WithoutExact bool
	// Progress, where not nil, is told how much of the work is done. It is
	// called from one goroutine at a time.
	Progress func(Progress)
}

// Nuisances is an ensemble of toys.
type Nuisances string

const (
	// Fixed toys have their parameters at nominal; auxiliary measurements
	// fluctuate.
	Fixed Nuisances = "fixed"
	// Drawn toys draw constrained parameters and simulation factors anew from
	// what is known of them; auxiliary measurements stay at nominal (Cousins &
	// Highland, Nucl. Instrum. Meth. A320 (1992) 331).
	Drawn Nuisances = "drawn"
)

// Progress of a run, in pseudo-experiments.
type Progress struct {
	Stage       string // what is under way, for example "luminosity 10: limits"
	Done, Total int64
}

// MinToys is the smallest sample that order-statistic errors of a 2σ quantile
// can be taken from.
const MinToys = 200

// A signal strength is a factor about 1: beyond these bounds the rates are what
// is wrong.
const (
	LeastMu = 1e-6
	MostMu  = 1e5
)
