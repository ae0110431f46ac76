package stats

// Shape gives the fraction of a process's events in each bin of its channel.
//
// Fill sets f[bin], which sums to 1, at the local quantities q. Where d1 is
// not nil it also sets the derivatives d1[a*len(f)+bin] = ∂f/∂q_a and
// d2[p*len(f)+bin] = ∂²f/∂q_a∂q_b, with the pairs p in the order (0,0), (0,1),
// …, (1,1), …. Quantities are in the units in which effects are linear: a
// mean, the logarithm of a width, a slope. A quantity at which the shape does
// not exist gives NaN, which a fit takes as a point to step back from. Fill
// neither allocates nor keeps its arguments, and may run in several goroutines
// at once.
type Shape interface {
	Fill(q, f, d1, d2 []float64)
}

// Effect adds Lin·x + Bend·g(Scale·x) of parameter Param to the logarithm of a
// rate, or Lin·x to one quantity of a shape; g is Bend. A relative change by
// the factors up and down has Lin = ½ ln(up/down) and Bend = ½ ln(up·down).
type Effect struct {
	Param int // index into Model.Params
	Lin   float64
	Bend  float64 // 0 unless up and down differ; rates only
	Scale float64 // of x where it bends, > 0; not looked at where Bend is 0
}

// Process is one source of events in a channel. It expects
//
//	Yield · exp(Σ Rate) · x[Factor] · (μ if Signal)
//
// events, spread over the bins by Shape at the quantities At[a] + Σ Move[a].
type Process struct {
	Yield  float64 // expected events at nominal parameters and μ = 1, >= 0
	Signal bool
	Factor int        // parameter that multiplies the yield, -1 for none; tied processes share it
	Rate   []Effect   // on the logarithm of the yield
	Shape  Shape      // nil where the channel has one bin
	At     []float64  // nominal quantities of Shape
	Move   [][]Effect // one list for each quantity; a free slope is an Effect with Lin = 1
}

// Channel is a set of bins filled by the same processes.
type Channel struct {
	Bins      int
	Processes []Process
	// Tau is the size of the simulation behind each bin's whole background, in
	// events of weight 1: (expectation / statistical error)². Where it is
	// positive the background of the bin is multiplied by a factor γ with the
	// auxiliary count Pois(γ·Tau): Barlow & Beeston, Comput. Phys. Commun. 77
	// (1993) 219, with one factor per bin as in Conway, arXiv:1103.0354. Nil: no
	// bin has one.
	Tau []float64
}

// Param is one nuisance parameter: a constrained one has an auxiliary
// measurement with unit normal error, a free one is known from the bins alone.
type Param struct {
	Name        string
	Constrained bool
	Nominal     float64
	Lower       float64 // bounds of a fit; ±Inf for none
	Upper       float64
	Step        float64 // a change of the parameter that matters, > 0; 1 for a constrained one
}

// Model is the expectation at one luminosity, as plain data: Poisson counts in
// the bins of every channel, unit normal auxiliary measurements of the
// constrained parameters. The signal strength μ multiplies every signal.
type Model struct {
	Channels []Channel
	Params   []Param
}

// Data is the outcome of one experiment.
type Data struct {
	N []float64 // counts, bins of all channels in order
	A []float64 // auxiliary measurements of the engine's constrained parameters, in order
	M []float64 // auxiliary counts of the simulation, one for each factor, in the order of bins
}

// Point is what an experiment is expected to give: the means of Data.
type Point struct {
	Lambda []float64
	A      []float64
	M      []float64
}
