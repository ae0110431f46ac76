package report

import (
	"math"

	"lumireach/physics"
	"lumireach/toys"
)

// Results made up to hold every case that the output knows. Their numbers belong
// to no model.

var nan = math.NaN()

func none() toys.Band {
	return toys.Band{Minus2: nan, Minus1: nan, Median: nan, Plus1: nan, Plus2: nan}
}

func header(command string) Header {
	return Header{
		Command: command, Version: "1.2.3", Title: "Slow pairs in the Tarnvik cellar", Source: "pairs/cellar.toml",
		SHA256: "00112233445566778899aabbccddeeff00112233445566778899aabbccddeeff", Unit: "kg·d",
	}
}

func reaches() map[string]*toys.ReachResult {
	return map[string]*toys.ReachResult{"full": fullReach(), "exact": exactReach(), "gaps": reachWithGaps(), "formulas": formulasOnly()}
}

var notes = []string{"precision 0.02 asked for, 0.017 reached with 6400 toys; the median limit at luminosity 300 was the last to settle, after four rounds"}

var cautions = []string{
	"Expected, not observed.",
	"A caution that is so long that it does not fit on one line of the table's prose, for which reason it continues on a second line, indented below the first.",
}

func formula() toys.Answer {
	return toys.Answer{
		Discovery: toys.Discovery{
			Z:        toys.Band{Minus2: 0, Minus1: 1.0345, Median: 2.0345, Plus1: 3.0345, Plus2: 4.0345},
			ZAtLeast: none(), Chance3: 0.1671, Chance5: 0.0015, ChanceOne: nan,
		},
		Exclusion: toys.Exclusion{
			MuUp:      toys.Band{Minus2: 0.4561, Minus1: 0.6112, Median: 0.8437, Plus1: 1.1904, Plus2: 9.996},
			MuUpOther: none(),
		},
	}
}

func thrown() *toys.Answer {
	return &toys.Answer{
		Discovery: toys.Discovery{
			Z:        toys.Band{Minus2: 0, Minus1: 1.051, Median: 2.0012, Plus1: 3.011, Plus2: 4.12},
			ZError:   toys.Band{Minus2: 0.03, Minus1: 0.021, Median: 0.0183, Plus1: 0.022, Plus2: 0.07},
			ZAtLeast: none(),
			Chance3:  0.1702, Chance3Error: 0.0053, Chance5: 0.0024, Chance5Error: 0.000693, ChanceOne: nan,
			Toys: 5000, NullToys: 20000, FailedFits: 3,
			Tail: &toys.Tail{ReachesZ: 7.25, EffectiveToys: 912.5, LargestShare: 0.0123},
		},
		Exclusion: toys.Exclusion{
			MuUp:      toys.Band{Minus2: 0.46, Minus1: 0.612, Median: 0.85, Plus1: 1.2, Plus2: 1.71},
			MuUpError: toys.Band{Minus2: 0.013, Minus1: 0.011, Median: 0.0099, Plus1: 0.0234, Plus2: 0.0996},
			MuUpOther: none(), Toys: 5000, FailedFits: 2,
		},
	}
}

func fullReach() *toys.ReachResult {
	return &toys.ReachResult{
		Config: toys.Config{Luminosities: []float64{30, 300}, Toys: 5000, Seed: 7, Mu: 1.5, Confidence: 0.95, Nuisances: toys.Fixed},
		Points: []toys.Point{
			{Luminosity: 30, Formula: formula(), Toys: thrown(), SmallestCount: 0.4},
			{Luminosity: 300, Formula: formula(), Toys: thrown(), SmallestCount: 4},
		},
		Goals: []toys.Goal{
			{Name: "evidence", Z: 3,
				Formula: toys.GoalAnswer{Luminosity: 65.21, Luminosity80: 105.7, Luminosity90: 130.2, Plateau: nan},
				Toys:    &toys.GoalAnswer{Luminosity: 67.1, Error: 1.3, Luminosity80: 107.9, Error80: 2.31, Luminosity90: 133.4, Error90: 12.3, Plateau: nan, Toys: 90000, FailedFits: 1}},
			{Name: "discovery", Z: 5,
				Formula: toys.GoalAnswer{Luminosity: 1802.3, Luminosity80: 2405.1, Luminosity90: 2790.4, BeyondList: true, Plateau: nan},
				Toys:    &toys.GoalAnswer{Luminosity: 1881, Error: 41.2, Luminosity80: 2511, Error80: 112, Luminosity90: 2904, Error90: 1234, BeyondList: true, Plateau: nan, Toys: 80000}},
			{Name: "exclusion", Confidence: 0.95,
				Formula: toys.GoalAnswer{Luminosity: 21.03, Luminosity80: 34.6, Luminosity90: 44.9, BeyondList: true, Plateau: nan},
				Toys:    &toys.GoalAnswer{Luminosity: 21.9, Error: 0.41, Luminosity80: 35.4, Error80: 0.995, Luminosity90: 45.1, Error90: 1.9, BeyondList: true, Plateau: nan, Toys: 70000}},
		},
		Checks: []toys.Check{
			{Z: 2, Plain: 5000, Passing: 121, Expected: 114.2, Pull: 0.64},
			{Z: 3, Plain: 5000, Passing: 6, Expected: 6.75, Pull: -0.29},
		},
		Notes: notes, Cautions: cautions,
	}
}

// reachWithGaps has no number where there can be none, and says why.
func reachWithGaps() *toys.ReachResult {
	const clean = "signal can fall where no background can: one event decides"
	first := formula()
	first.Discovery = toys.Discovery{Z: none(), ZAtLeast: none(), Chance3: nan, Chance5: nan, ChanceOne: 0.864664, Why: clean, ChanceWhy: clean}
	firstToys := thrown()
	firstToys.Discovery = toys.Discovery{
		Z: none(), ZAtLeast: none(), Chance3: nan, Chance5: nan,
		ChanceOne: 0.864664, Why: clean, ChanceWhy: clean,
	}
	firstToys.Exclusion.MuUpOther = toys.Band{Minus2: 0.39, Minus1: nan, Median: 0.912, Plus1: nan, Plus2: nan}

	second := formula()
	second.Discovery.ChanceOne = 0.98168436
	second.Exclusion = toys.Exclusion{MuUp: none(), MuUpOther: none(), Why: "the limit lies above every signal strength tried"}
	secondToys := thrown()
	d := &secondToys.Discovery
	d.Z.Median, d.Z.Plus1, d.Z.Plus2 = nan, nan, nan
	d.ZError.Median, d.ZError.Plus1, d.ZError.Plus2 = 0, 0, 0
	d.ZAtLeast = toys.Band{Minus2: nan, Minus1: nan, Median: 4.6789, Plus1: 4.6789, Plus2: 4.6789}
	d.Why = "the background-only toys reach 4.7 standard deviations"
	d.Chance5, d.Chance5Error, d.ChanceWhy = nan, nan, "5 standard deviations lie beyond the tail of the toys"
	d.ChanceOne = 0.98168436
	d.FailedFits = 17
	x := &secondToys.Exclusion
	x.MuUp.Plus2, x.MuUpError.Plus2 = nan, nan
	x.Why = "too few toys: 12 of 100 resampled sets give no limit"

	return &toys.ReachResult{
		Config: toys.Config{Luminosities: []float64{2, 40}, Toys: 200, Seed: 18446744073709551615, Mu: 1, Confidence: 0.9, Nuisances: toys.Drawn},
		Points: []toys.Point{
			{Luminosity: 2, Formula: first, Toys: firstToys, SmallestCount: 0.001},
			{Luminosity: 40, Formula: second, Toys: secondToys, SmallestCount: 0.02},
		},
		Goals: []toys.Goal{
			{Name: "evidence", Z: 3,
				Formula: toys.GoalAnswer{Luminosity: nan, Luminosity80: nan, Luminosity90: nan, Plateau: 2.71,
					Why: "the median never passes 2.71", Why80: "the median never passes 2.71", Why90: "the median never passes 2.71"},
				Toys: &toys.GoalAnswer{Luminosity: 55, Error: 3, Luminosity80: nan, Error80: nan, Luminosity90: nan, Error90: nan, Plateau: nan,
					Why80: "the toys do not reach so far", Why90: "the toys do not reach so far", Toys: 3000}},
			{Name: "exclusion", Confidence: 0.9,
				Formula: toys.GoalAnswer{Luminosity: 12, Luminosity80: 19, Luminosity90: 25, Plateau: nan},
				Toys: &toys.GoalAnswer{Luminosity: nan, Luminosity80: nan, Luminosity90: nan, Plateau: nan,
					Why: "every fit failed", Why80: "every fit failed", Why90: "every fit failed", Toys: 600, FailedFits: 600}},
		},
		Notes: notes, Cautions: cautions,
	}
}

func formulasOnly() *toys.ReachResult {
	r := fullReach()
	r.Config.Toys, r.Config.Seed = 0, 1
	for i := range r.Points {
		r.Points[i].Toys = nil
	}
	for i := range r.Goals {
		r.Goals[i].Toys = nil
	}
	r.Goals[1].Formula = toys.GoalAnswer{Luminosity: nan, Luminosity80: nan, Luminosity90: nan, Plateau: 4.2,
		Why: "systematic uncertainties hold the median at 4.2", Why80: "not even half reach it", Why90: "not even half reach it"}
	r.Checks = nil
	return r
}

func bands() map[string]*toys.BandsResult {
	out := map[string]*toys.BandsResult{}
	for name, r := range reaches() {
		b := &toys.BandsResult{Config: r.Config, Notes: r.Notes, Cautions: r.Cautions}
		for _, p := range r.Points {
			point := toys.BandsPoint{Luminosity: p.Luminosity, Formula: p.Formula.Exclusion}
			if p.Toys != nil {
				x := p.Toys.Exclusion
				point.Toys = &x
			}
			b.Points = append(b.Points, point)
		}
		out[name] = b
	}
	return out
}

func expectedYields() physics.Yields {
	return physics.Yields{
		Luminosity: 30, Unit: "kg·d",
		Channels: []physics.ChannelYields{
			{Name: "pairs", Unit: "keV", Window: []float64{2, 12.5}, Bins: 21,
				Signals: []physics.Expected{{Name: "signal", Form: physics.Form{Kind: "gaussian"}, Events: 9.9996}},
				Backgrounds: []physics.Expected{
					{Name: "wall glow", Form: physics.Form{Kind: "exponential"}, Events: 1000},
					{Name: "dust", Form: physics.Form{Kind: "template"}, Events: 0},
				},
				Best:               &physics.Interval{FirstBin: 5, Bins: 4, Low: 4.5, High: 6.5, Signal: 8.123456, Background: 61.5},
				SmallestBackground: 0.0123, SmallestTotal: 0.0345,
				Simulation: &physics.Simulation{Factors: 19, Smallest: 0.00312, Largest: 0.345}},
			{Name: "singles", Bins: 1,
				Signals:            []physics.Expected{{Name: "prompt", Events: 2e-7}, {Name: "late", Events: 3}},
				Backgrounds:        []physics.Expected{{Name: "chance", Events: 12345678}},
				Best:               &physics.Interval{Bins: 1, Low: nan, High: nan, Signal: 3, Background: 12345678},
				SmallestBackground: 12345678, SmallestTotal: 12345681,
				Simulation: &physics.Simulation{Factors: 1, Smallest: 0.1, Largest: 0.1}},
			{Name: "door open", Bins: 1,
				Backgrounds:        []physics.Expected{{Name: "chance", Events: 40}},
				SmallestBackground: nan, SmallestTotal: nan},
		},
		Parameters: []physics.Parameter{
			{Name: "pairs wall glow slope", Kind: physics.Free, Effects: []physics.Acts{{Channel: "pairs", Process: "wall glow", Moves: "slope"}}},
			{Name: "chance rate", Kind: physics.Tied, Effects: []physics.Acts{
				{Channel: "singles", Process: "chance", Moves: "rate"}, {Channel: "door open", Process: "chance", Moves: "rate"}}},
			{Name: "energy scale", Kind: physics.Constrained, Scale: 1, Effects: []physics.Acts{
				{Channel: "pairs", Process: "signal", Moves: "mean", Size: "−0.05 keV", Shift: -0.05}}},
			{Name: "radon", Kind: physics.Constrained, Shrinks: true, Scale: 0.66143783, Effects: []physics.Acts{
				{Channel: "pairs", Process: "dust", Moves: "template", Size: "−12 … +8 % / −7 … +13.5 %"},
				{Channel: "pairs", Process: "dust", Moves: "rate", Size: "+4 % / −2 %", Up: 1.04, Down: 0.98}}},
			{Name: "chance", Kind: physics.Constrained, Shrinks: true, Scale: 2, Effects: []physics.Acts{
				{Channel: "singles", Process: "chance", Moves: "rate", Size: "+21 %", Up: 1.21, Down: 1 / 1.21}}},
			{Name: "idle", Kind: physics.Constrained},
		},
	}
}

// exactReach has a third column.
func exactReach() *toys.ReachResult {
	r := fullReach()
	for i := range r.Points {
		a := toys.ExactAnswer{Answer: toys.Answer{
			Discovery: toys.Discovery{Z: toys.Band{Minus1: 1.03, Median: 2.0512345, Plus1: 3.1, Plus2: 4.02}, ZAtLeast: none(), Chance3: 0.17012, Chance5: 0.0024, ChanceOne: nan},
			Exclusion: toys.Exclusion{MuUp: toys.Band{Minus2: 0.461234, Minus1: 0.6125, Median: 0.84567, Plus1: 1.2034, Plus2: 1.7098}, MuUpOther: none()},
		}, Coverage: 0.9612}
		r.Points[i].Exact = &a
	}
	for k, values := range [][2]float64{{66.04, 67.812}, {1860, 1860}, {nan, nan}} {
		g := &toys.ExactGoal{}
		for i := range g.First {
			g.First[i], g.AlwaysAfter[i] = values[0]*float64(i+1), values[1]*float64(i+1)
			if k == 2 {
				g.Why[i] = "more outcomes matter than can be summed"
			}
		}
		r.Goals[k].Exact = g
	}
	return r
}

// crosschecked has every verdict.
func crosschecked() *toys.CrosscheckResult {
	tolerances := toys.Tolerances{Relative: 0.05, Z: 0.1, Chance: 0.02}
	median := toys.Comparison{Quantity: "median Z", Group: toys.Discovering, Kind: toys.Significances, Luminosity: 30,
		Formula: 2.05, Toys: 2.061, Error: 0.012, Exact: nan, Difference: 0.011, DError: 0.012, Tolerance: 0.1, Verdict: toys.Good}
	tail := toys.Comparison{Quantity: "significance of q0 = 25", Group: toys.Discovering, Kind: toys.Significances, Luminosity: 30,
		Formula: 5, Toys: nan, Error: nan, Exact: nan, Difference: nan, DError: nan, Tolerance: 0.1, Verdict: toys.Untested, Why: "too few toys share that tail"}
	chance := toys.Comparison{Quantity: "chance of 3σ", Group: toys.Discovering, Kind: toys.Chances, Luminosity: 30,
		Formula: 0.17, Toys: 0.189, Error: 0.0041, Exact: nan, Difference: 0.019, DError: 0.0041, Tolerance: 0.02, Verdict: toys.Undecided, MoreToys: 12345}
	limit := toys.Comparison{Quantity: "−2σ limit on μ", Group: toys.Excluding, Kind: toys.Ratios, Luminosity: 30,
		Formula: 0.41, Toys: 0.46, Error: 0.004, Exact: 0.4612, Difference: 0.111, DError: 0, Tolerance: 0.05, Verdict: toys.Off}
	tilde := toys.Comparison{Quantity: "P(q̃ ≥ its median) without signal", Group: toys.Excluding, Kind: toys.Chances, Luminosity: 30,
		Formula: 0.5, Toys: 0.561, Error: 0.007, Exact: nan, Difference: 0.061, DError: 0.007, Tolerance: 0.02, Verdict: toys.Off}
	goal := toys.Comparison{Quantity: "discovery, 5σ, by 50 % of experiments", Group: toys.Discovering, Kind: toys.Ratios, Luminosity: nan,
		Formula: 1802, Toys: 1881, Error: 41.2, Exact: nan, Difference: 0.042, DError: 0.022, Tolerance: 0.05, Verdict: toys.Undecided, MoreToys: 900}
	return &toys.CrosscheckResult{
		Config:     toys.Config{Luminosities: []float64{30, 300}, Toys: 10000, Seed: 7, Mu: 1, Confidence: 0.95, Nuisances: toys.Fixed},
		Tolerances: tolerances,
		Points: []toys.CrosscheckPoint{
			{Luminosity: 30, Comparisons: []toys.Comparison{tail, median, chance, limit, tilde}, Reasons: []string{"few events: the smallest expected count that the signal reaches is 0.4"}},
			{Luminosity: 300, Comparisons: []toys.Comparison{median}, Reasons: []string{"few events: the smallest expected count that the signal reaches is 4", "discrete outcomes: the median one alone has a probability of 0.1"}},
		},
		Goals: []toys.Comparison{goal},
		Distributions: []toys.Distribution{{Statistic: "q0", Hypothesis: "background only", Luminosity: 30,
			Edges: []float64{0, 0.25, 0.5}, Probability: []float64{0.6, 0.4}, Error: []float64{0.01, 0.008}, Formula: []float64{0.599, 0.401}}},
		From:    map[toys.Group]float64{toys.Discovering: 300, toys.Excluding: nan},
		FromWhy: map[toys.Group]string{toys.Excluding: "−2σ limit on μ at 30: off by 11 %"},
		Notes:   notes, Cautions: cautions,
	}
}
