package toys

import (
	"math"
	"sort"
	"testing"

	"lumireach/stats"
)

// enumeration is all outcomes of a count with a control region, in falling order
// of a test statistic, with their probabilities under background only and under a
// signal: an exact reference for the toys.
type enumeration []struct{ q, null, signal float64 }

func enumerate(e *stats.Engine, mu float64, statistic func(*stats.Fitter, *stats.Data) float64) enumeration {
	null, signal := e.Point(0, nil).Lambda, e.Point(mu, nil).Lambda
	around := func(k int) (low, high int) {
		a, b := math.Min(null[k], signal[k]), math.Max(null[k], signal[k])
		return max(0, int(a-9*math.Sqrt(a)-5)), int(b + 9*math.Sqrt(b) + 10)
	}
	f := e.Fitter()
	d := stats.Data{N: make([]float64, 2)}
	var out enumeration
	low0, high0 := around(0)
	low1, high1 := around(1)
	for n := low0; n <= high0; n++ {
		for m := low1; m <= high1; m++ {
			p := math.Exp(stats.LogPoisson(n, null[0]) + stats.LogPoisson(m, null[1]))
			s := math.Exp(stats.LogPoisson(n, signal[0]) + stats.LogPoisson(m, signal[1]))
			if p > 1e-17 || s > 1e-17 {
				d.N[0], d.N[1] = float64(n), float64(m)
				out = append(out, struct{ q, null, signal float64 }{statistic(f, &d), p, s})
			}
		}
	}
	sort.Slice(out, func(i, j int) bool { return out[i].q > out[j].q })
	return out
}

func q0Of(f *stats.Fitter, d *stats.Data) float64 {
	q, _ := f.Q0(d, 0)
	return q
}

func qTildeOf(mu float64) func(*stats.Fitter, *stats.Data) float64 {
	return func(f *stats.Fitter, d *stats.Data) float64 {
		q, _ := f.QTilde(d, mu, f.Free(d, 0, math.Inf(1)))
		return q
	}
}

// exactMedianZ is the significance of the median signal outcome.
func exactMedianZ(e *stats.Engine) float64 {
	var null, signal float64
	for _, o := range enumerate(e, 1, q0Of) {
		null += o.null
		if signal += o.signal; signal >= 0.5 {
			break
		}
	}
	return stats.Significance(null)
}

// walkCLs calls do with P(q̃ >= q) without signal and the CLs of each outcome.
func (o enumeration) walkCLs(do func(null, cls float64) bool) {
	var null, signal float64
	for i := range o {
		null += o[i].null
		signal += o[i].signal
		if (i+1 == len(o) || o[i+1].q < o[i].q-tie) && !do(null, signal/null) {
			return
		}
	}
}

// exactLimit is the u-quantile of the 95 % CLs limits.
func exactLimit(t *testing.T, e *stats.Engine, u, low, high float64) float64 {
	t.Helper()
	logMu, err := stats.Root(func(logMu float64) float64 {
		mu := math.Exp(logMu)
		found := math.NaN()
		enumerate(e, mu, qTildeOf(mu)).walkCLs(func(null, cls float64) bool {
			found = cls
			return null < u
		})
		return stats.PhiInverse(found) - stats.PhiInverse(0.05)
	}, math.Log(low), math.Log(high), 1e-5)
	if err != nil {
		t.Fatal(err)
	}
	return math.Exp(logMu)
}

// exactExcluded is the fraction of experiments without signal that exclude μ = 1.
func exactExcluded(e *stats.Engine) float64 {
	excluded := 0.0
	enumerate(e, 1, qTildeOf(1)).walkCLs(func(null, cls float64) bool {
		if cls <= 0.05 {
			excluded = null
		}
		return true
	})
	return excluded
}

// exactAnswers are those of answers for a count with a control region, by exact
// sums. The goals' curves step finely; a line through values within 3 % of the
// formula's answer stands for them.
func exactAnswers(t *testing.T, search stats.Search, luminosity float64) []float64 {
	t.Helper()
	e := engine(t, search, luminosity)
	p := 0.0
	for _, o := range enumerate(e, 1, q0Of) {
		if o.q >= 25-tie {
			p += o.null
		}
	}
	out := []float64{p, exactMedianZ(e)}
	for i, u := range quantiles {
		formula, err := e.ExpectedLimit(float64(i-2), 0.95)
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, exactLimit(t, e, u, formula/1.5, formula*1.5))
	}
	crossing := func(target float64, formula func(*stats.Engine) (float64, error), value func(*stats.Engine) float64) float64 {
		near, err := search.Luminosity(func(e *stats.Engine) (float64, error) {
			v, err := formula(e)
			return v - target, err
		}, 1e-3, 1e3)
		if err != nil {
			t.Fatal(err)
		}
		var x, y, one []float64
		for k := -6; k <= 6; k++ {
			x = append(x, float64(k)*0.005)
			y = append(y, value(engine(t, search, near*math.Exp(float64(k)*0.005))))
			one = append(one, 1)
		}
		intercept, slope := line(x, y, one)
		return near * math.Exp((target-intercept)/slope)
	}
	z := func(e *stats.Engine) (float64, error) { return e.MedianZ(1) }
	return append(out,
		crossing(3, z, exactMedianZ),
		crossing(5, z, exactMedianZ),
		crossing(0, func(e *stats.Engine) (float64, error) { return e.ExclusionN(0.95) },
			func(e *stats.Engine) float64 { return stats.PhiInverse(exactExcluded(e)) }))
}
