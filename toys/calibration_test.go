package toys

import (
	"context"
	"math"
	"os"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/stat"

	"lumireach/stats"
)

// answers are the numbers of one run whose errors are calibrated, with them.
func answers(t *testing.T, search stats.Search, luminosity float64, seed uint64, toys int) (values, errs []float64) {
	t.Helper()
	r, err := Reach(context.Background(), search, Config{WithoutExact: true, Luminosities: []float64{luminosity}, Toys: toys, Seed: seed})
	if err != nil {
		t.Fatal(err)
	}
	add := func(v, e float64) {
		values = append(values, v)
		errs = append(errs, e)
	}
	run := testRunner(t, Config{Seed: seed, Toys: toys})
	null, err := run.null(engine(t, search, luminosity), luminosity, span{1, 5}, toys, nil)
	if err != nil {
		t.Fatal(err)
	}
	e := null.p(25)
	add(e.p, e.err)
	d, x := r.Points[0].Toys.Discovery, r.Points[0].Toys.Exclusion
	add(d.Z.Median, d.ZError.Median)
	mu, muError := x.MuUp.list(), x.MuUpError.list()
	for i := range mu {
		add(mu[i], muError[i])
	}
	for _, g := range r.Goals {
		add(g.Toys.Luminosity, g.Toys.Error)
	}
	return values, errs
}

var answerNames = []string{
	"P(q0 >= 25)", "median Z", "limit -2σ", "limit -1σ", "limit median", "limit +1σ", "limit +2σ",
	"L for 3σ", "L for 5σ", "L for exclusion",
}

// exactCount are the answers for onOff(25, 150, 2) at luminosity 1 by exact sums
// over outcomes, which the long test makes again.
var exactCount = []float64{2.82475e-07, 1.60815, 0.629698, 0.854847, 1.20276, 1.68013, 2.26581, 3.47644, 9.65599, 1.43703}

// The quoted errors are those of the scatter over seeds about the truth: exact
// sums for a count, a run with fifty times the toys for a window. By default few
// seeds on the count, with bounds of 4.5 standard errors (right code fails for 1
// seed in 150000 per check). LUMIREACH_SEEDS=200 runs the full calibration, on the
// window too, and asks for a mean within ±0.21 and a width within 1 ± 0.15, three
// standard errors; that of the mean is wider on the window by the error of its
// truth.
func TestErrorCalibration(t *testing.T) {
	seeds := 24
	if testing.Short() {
		seeds = 8
	}
	meanBound, widthBound := 4.5/math.Sqrt(float64(seeds)), 4.5/math.Sqrt(2*float64(seeds))
	long := os.Getenv("LUMIREACH_SEEDS") != ""
	if long {
		var err error
		if seeds, err = strconv.Atoi(os.Getenv("LUMIREACH_SEEDS")); err != nil {
			t.Fatal(err)
		}
		meanBound, widthBound = 0.21, 0.15
	}
	calibrate := func(t *testing.T, search stats.Search, luminosity float64, toys int, truth, truthError []float64, meanBound float64) {
		pulls := make([][]float64, len(truth))
		for seed := range seeds {
			values, errs := answers(t, search, luminosity, uint64(seed+1), toys)
			for i := range values {
				if !math.IsNaN(values[i]) { // refused, with a reason
					pulls[i] = append(pulls[i], (values[i]-truth[i])/math.Hypot(errs[i], truthError[i]))
				}
			}
		}
		for i, p := range pulls {
			mean, width := stat.MeanStdDev(p, nil)
			t.Logf("%-16s truth %.5g ± %.2g: pulls of %d seeds: mean %+.2f, width %.2f", answerNames[i], truth[i], truthError[i], len(p), mean, width)
			if len(p) < seeds*9/10 {
				t.Errorf("%s: %d of %d seeds give a number", answerNames[i], len(p), seeds)
			}
			if !(math.Abs(mean) <= meanBound) || !(math.Abs(width-1) <= widthBound) {
				t.Errorf("%s: pulls have mean %.2f and width %.2f, want 0 ± %.2f and 1 ± %.2f", answerNames[i], mean, width, meanBound, widthBound)
			}
		}
	}
	t.Run("count", func(t *testing.T) {
		search, toys := onOff(25, 150, 2), 600
		if long {
			toys = 4000
			for i, v := range exactAnswers(t, search, 1) {
				if math.Abs(v-exactCount[i]) > 1e-4*v {
					t.Errorf("exact %s = %v, was %v", answerNames[i], v, exactCount[i])
				}
			}
		}
		calibrate(t, search, 1, toys, exactCount, make([]float64, len(exactCount)), meanBound)
	})
	if long {
		t.Run("window", func(t *testing.T) {
			search := scenario(t, "window")
			const toys, more = 2000, 50
			truth, truthError := answers(t, search, 2, 1_000_000, more*toys)
			calibrate(t, search, 2, toys, truth, truthError, math.Hypot(meanBound, 3/math.Sqrt(more)))
		})
	}
}
